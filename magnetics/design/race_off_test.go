//go:build !race

package design

// raceEnabled is whether the race detector slows these tests down.
const raceEnabled = false

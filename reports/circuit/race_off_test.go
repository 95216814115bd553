//go:build !race

package circuit

// raceEnabled is whether the race detector slows these tests down.
const raceEnabled = false

// Package tank solves the periodic steady state of a resonant tank.
package tank

// Package field solves the magnetic field in a winding window.
package field

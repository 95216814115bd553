// Package quantity parses and prints quantities with units and holds the
// physical constants that more than one package needs. Everything inside the
// program is coherent SI (H, F, A, V, s, m, W, T, ohm, kg); temperatures alone
// are in °C.
package quantity

// Mu0 is the magnetic constant in H/m, CODATA 2022.
const Mu0 = 1.25663706127e-6

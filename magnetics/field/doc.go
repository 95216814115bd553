// Package field solves the static magnetic field in and around a winding
// window, for any number of unit solutions at once.
//
// # Window
//
// x runs across the window from the face of the post outward, y along the
// winding breadth (r and z around a round post). The window is a closed
// rectangle in ferrite: depth b along x, breadth h along y. The vector
// potential is a cosine series along y with exact exponentials across,
//
//	A = a_0(x) + sum a_m(x) cos(k_m y),  k_m = m pi/h
//	H_x = (1/mu0) dA/dy,  H_y = -(1/mu0) dA/dx
//
// so that no grid is needed and no growing exponential appears (the method is
// known since Roth and Rabins). Around a round post r A takes the place of A,
// and substituting v = sqrt(r) A per mode leaves
// -v” + (k^2 + 3/(4 r^2)) v = mu0 J sqrt(r), which is solved with exact
// exponentials on steps thin against the radius.
//
// # Unit solutions
//
// A unit solution is the field of 1 A in one winding (any set of rectangles
// with stated ampere-turns). Currents, fields and ampere-turns are peak values
// throughout; energies are mu0 H^2/2 at those peaks. Because the field is
// linear, complex harmonics combine as quadratic forms of the matrices returned.
//
// # Ampere-turns that are left over
//
// The ampere-turns of a unit solution that other windings do not cancel fall
// along the core: over gaps in the post and in the outer leg, whose field at
// the mouth is prescribed, and over the ferrite, which is spread evenly over
// the walls. They share by least energy, which is the condition of equal flux.
//
// # Limits
//
// Two-dimensional. Ferrite has infinite permeability but for the drop named
// above. Conductors carry their current with uniform density; what eddy
// currents do is the business of package acloss.
package field

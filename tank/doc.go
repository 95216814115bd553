// Package tank solves the periodic steady state of a series-LC or LLC tank
// between a square-wave bridge and a rectifier with a smooth output voltage.
//
// # Model
//
// Everything is referred to the primary: Rp is the resistance of bridge,
// capacitor and primary winding, Rs = n² (secondary winding + conducting
// rectifiers), n the primary turns per turn of one secondary winding. The bridge
// applies +Vb or -Vb: half the input voltage in a half bridge, whose Cr holds
// the other half as DC, the whole of it in a full bridge. The rectifier holds
// the winding at ±E, E = n (kv Vout + kd drop), plus the drop of Rs:
//
//	rectifier         kv   kd   ki
//	center-tapped     1    1    1     two windings, each conducts half the time
//	full-bridge       1    2    1     one winding
//	voltage-doubler   1/2  1    1/2   one winding
//
// with Iout = ki n mean |i - m|, i the current of Lr and m that of Lm. So one
// half period is a sequence of three linear circuits: rectifier conducting
// forward, backward, or off, in any order. The solver follows the sequence from
// event to event (no list of known sequences), and finds by Newton's method the
// state that returns with its sign turned after half a period while the output
// voltage and the load agree.
//
// With a dead time the half period begins when a switch turns off: the bridge is
// then left to the current, which moves the node capacitance, until it is held by
// the diode of the other rail or the other switch turns on. Swing and dead time
// are part of the periodic state, so soft switching is exact near 1 MHz too, and
// near the peak of the gain, where the current turns round within the dead time.
// Without a dead time the edges are ideal.
//
// Assumptions: no ripple of the output voltage, drop independent of current,
// linear Lm and node capacitance, body diodes without drop, halves of a center
// tap alike, capacitances of winding and rectifiers only as a part of the node's.
//
// # Signs
//
// The bridge is positive over the first half of the period, t = 0 is the
// middle of its rising edge. i flows out of the bridge, m down through Lm. A
// peak is the greatest absolute value. A harmonic is A sin(k w t + phase).
package tank

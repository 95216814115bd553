package tank

// SoftSwitching says what the node capacitance leaves of the bridge's swing
// during the dead time.
type SoftSwitching struct {
	Complete    bool    // the other rail is reached within the dead time and held to its end
	SwingTime   float64 // s; 0 when incomplete
	VoltageLeft float64 // V, of one node when the dead time ends
	EndCurrent  float64 // A, i when the dead time ends; above 0 it holds the node
}

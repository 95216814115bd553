package tank

import (
	"gapwright/tank/waveform"
)

// BridgeVoltage returns the voltage that the bridge puts on the tank t, without
// the half bridge's DC: what Lr, the resistances, Cr and Lm share. It goes
// between plus and minus the bridge voltage, and in the dead time shows the
// edge. For an Operation that is not OK it is empty.
func (o *Operation) BridgeVoltage(t Tank) waveform.Wave {
	i := o.ResonantCurrent
	u := waveform.Wave{Period: i.Period, Alternating: i.Alternating, Pieces: make([]waveform.Piece, len(i.Pieces))}
	r := t.BridgeResistance + t.CapacitorResistance + t.PrimaryResistance
	for k := range i.Pieces {
		p, q := &i.Pieces[k], &u.Pieces[k]
		v, m := &o.CapacitorVoltage.Pieces[k], &o.MagnetizingVoltage.Pieces[k]
		q.Start, q.Duration = p.Start, p.Duration
		for j := range q.C {
			q.C[j] = r*p.C[j] + v.C[j] + m.C[j]
			if j+1 < len(p.C) && p.Duration > 0 {
				q.C[j] += t.Lr * float64(j+1) * p.C[j+1] / p.Duration
			}
		}
	}
	return u
}

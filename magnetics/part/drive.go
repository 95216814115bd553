package part

import (
	"math/cmplx"

	"gapwright/tank"
	"gapwright/tank/waveform"
)

// A Drive is one corner of the tank as the windings of a part carry it.
type Drive struct {
	Name       string
	Continuous bool    // heat counts
	Share      float64 // of the operating time
	Frequency  float64 // Hz
	// Phasors[w][k] is the amplitude of harmonic k of the current INTO the dotted
	// end of winding w, A on its own side; k = 0 is the DC part.
	Phasors   [][]complex128
	RMS       []float64 // A, of each winding
	Peak      float64   // A, of the first winding
	Resonant  waveform.Wave
	Magnetize waveform.Wave // A, of the tank's Lm, on the primary
}

// TransformerDrives returns what the windings of a transformer carry: primary,
// then each secondary. A rectifier draws its current out of the dotted end of
// the first winding of a center tap and into that of the second.
func TransformerDrives(operations []tank.Operation) []Drive {
	var drives []Drive
	for _, o := range operations {
		if o.Status != tank.OK {
			continue
		}
		d := drive(o)
		for w, h := range o.ISecondaryHarmonics {
			into := make([]complex128, len(h))
			for k := range h {
				if w == 0 {
					into[k] = -h[k]
				} else {
					into[k] = h[k]
				}
			}
			d.Phasors = append(d.Phasors, into)
			d.RMS = append(d.RMS, o.Windings[w].RMS)
		}
		drives = append(drives, d)
	}
	return drives
}

// InductorDrives returns what the winding of the resonant inductor carries.
func InductorDrives(operations []tank.Operation) []Drive {
	var drives []Drive
	for _, o := range operations {
		if o.Status == tank.OK {
			drives = append(drives, drive(o))
		}
	}
	return drives
}

func drive(o tank.Operation) Drive {
	return Drive{
		Name: o.Corner.Name, Continuous: o.Corner.Duration == 0, Share: o.Corner.Share, Frequency: o.Frequency,
		Phasors: [][]complex128{o.IPrimaryHarmonics}, RMS: []float64{o.Resonant.RMS}, Peak: o.Resonant.Peak,
		Resonant: o.ResonantCurrent, Magnetize: o.MagnetizingCurrent,
	}
}

// product returns the real part of conj(I_a) I_b of harmonic k.
func (d *Drive) product(a, b, k int) float64 {
	return real(cmplx.Conj(d.Phasors[a][k]) * d.Phasors[b][k])
}

package job

import (
	"crypto/sha256"
	"encoding/hex"

	"gapwright/corelib/document"
)

// Hash returns the design hash of Transformer or Inductor: 12 hexadecimal digits
// that change with any decision about the part, with the tank and with the
// corners, and with nothing else. It stands on the part's sheet. The hash of an
// inductor that is not there is empty.
func (b BuildFile) Hash(which string) (string, error) {
	c := b.Transformer.Construction
	switch {
	case which != Transformer && which != Inductor:
		panic("job: no part is called " + which)
	case which == Inductor && b.Inductor == nil:
		return "", nil
	case which == Inductor:
		c = b.Inductor.Construction
	}
	shared, tests, err := unmap(c)
	if err != nil {
		return "", err
	}
	var section any = transformerFile{shared, transformerMeets{requirement(b.Transformer.OpenInductance), requirement(b.Transformer.ShortInductance)}, tests}
	if which == Inductor {
		section = inductorFile{shared, inductorMeets{requirement(b.Inductor.Inductance)}, tests}
	}
	corners := make([]corner, len(b.Job.Corners))
	for i, c := range b.Job.Corners {
		corners[i] = corner(c)
	}
	sum := sha256.New()
	sum.Write(document.Canonical(section))
	sum.Write(document.Canonical(struct {
		Tank    tankFile `key:"tank"`
		Corners []corner `key:"corners"`
	}{tankFile(b.Job.Tank), corners}))
	return hex.EncodeToString(sum.Sum(nil))[:12], nil
}

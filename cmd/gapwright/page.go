package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"path/filepath"

	"gapwright/magnetics/design"
	"gapwright/reports/page"
)

// pageName is the file of the page in the folder of a design.
const pageName = "design.html"

// newPage renders the page of a design; failure says why there are no parts.
func newPage(ctx context.Context, d *design.Design, lib library, failure error) ([]byte, error) {
	in := page.Input{Design: d, MadeWith: fmt.Sprintf("gapwright %s, tables %s", version, tablesVersion)}
	if failure != nil {
		// What was tried last is no result.
		bare := *d
		bare.Transformer, bare.Inductor, bare.Rating, bare.InductorRating, bare.Operations = nil, nil, nil, nil, d.Wanted
		in.Design, in.Failure = &bare, failure.Error()
	} else {
		var err error
		if in.View, err = design.NewView(d, lib.tables()); err != nil {
			return nil, err
		}
		if in.Explanations, err = design.ExplainAll(ctx, d, lib.tables()); err != nil {
			return nil, err
		}
	}
	var b bytes.Buffer
	if err := page.Write(&b, in); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// writeFailurePage writes the page of work that ended without parts: the tank,
// and what stopped each core size. Other errors leave the folder alone.
func writeFailurePage(ctx context.Context, folder string, d *design.Design, lib library, failure error) error {
	var tankErr *design.TankError
	var none *design.InfeasibleError
	if folder == "" || d == nil || !errors.As(failure, &tankErr) && !errors.As(failure, &none) {
		return nil
	}
	html, err := newPage(ctx, d, lib, failure)
	if err != nil {
		return err
	}
	if err := makeFolder(folder); err != nil {
		return err
	}
	return writeWhole(filepath.Join(folder, pageName), html)
}

package design

import (
	"math"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)


package emit_test

import (
	"testing"

	"polewright/estimator/emit"
)

func checkST(t *testing.T, files []emit.File) { t.Helper() }

//go:build peer

package closing

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { findingtest.Rerun(t, "closing") }

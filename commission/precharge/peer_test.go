//go:build peer

package precharge

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { findingtest.Rerun(t, "charge") }

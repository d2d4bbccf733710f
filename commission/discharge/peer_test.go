//go:build peer

package discharge

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { findingtest.Rerun(t, "discharge") }

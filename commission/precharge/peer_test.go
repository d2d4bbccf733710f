//go:build peer

package precharge

import (
	"testing"

	"chargehand/commission/precharge/workedtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { workedtest.Rerun(t, "charge") }

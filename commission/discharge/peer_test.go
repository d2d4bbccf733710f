//go:build peer

package discharge

import (
	"testing"

	"chargehand/commission/precharge/workedtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { workedtest.Rerun(t, "discharge") }

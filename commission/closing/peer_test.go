//go:build peer

package closing

import (
	"testing"

	"chargehand/commission/precharge/workedtest"
)

func TestNgspiceStillMeasuresTheSame(t *testing.T) { workedtest.Rerun(t, "closing") }

//go:build peer

package droop

import (
	"os/exec"
	"testing"

	"chargehand/commission/finding/findingtest"
)

// The netlist is run again: the stored output is what ngspice gives.
func TestSolveAgainstNgspice(t *testing.T) {
	out, err := exec.Command("ngspice", "-b", "testdata/bus.cir").Output()
	if err != nil {
		t.Fatalf("run ngspice -b testdata/bus.cir: %v", err)
	}
	compareWithNetlist(t, findingtest.Measured(t, out))
}

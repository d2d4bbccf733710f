//go:build peer

package findingtest

import (
	"math"
	"os/exec"
	"testing"
)

// Rerun runs the circuit simulator on testdata/NAME.cir again and compares with the stored testdata/NAME.out.
func Rerun(t *testing.T, name string) {
	t.Helper()
	command := exec.Command("ngspice", "-b", name+".cir")
	command.Dir = "testdata"
	out, err := command.Output()
	if err != nil && len(out) == 0 {
		t.Fatalf("ngspice -b %s.cir: %v", name, err)
	}
	now := Measured(t, out)
	for what, want := range Stored(t, "testdata/"+name+".out") {
		if got, ok := now[what]; !ok || math.Abs(got-want) > 1e-4*math.Abs(want) {
			t.Errorf("ngspice %s: %s = %v, want the stored %v", name, what, got, want)
		}
	}
}

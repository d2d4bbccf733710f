//go:build peer

package circuit

import (
	"context"
	"os/exec"
	"regexp"
	"strings"
	"testing"
	"time"
)

var figureLine = regexp.MustCompile(`(?m)^[a-z_0-9.]+ += .*$`)

func TestStepAgreesWithNgspice(t *testing.T) {
	for _, c := range spiceCases {
		t.Run(c.netlist, func(t *testing.T) {
			ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
			defer cancel()
			cmd := exec.CommandContext(ctx, "ngspice", "-b", c.netlist+".cir")
			cmd.Dir = "testdata"
			text, err := cmd.Output()
			if err != nil {
				t.Fatalf("ngspice -b %s.cir: %v", c.netlist, err)
			}
			compareFigures(t, c, figures(t, strings.Join(figureLine.FindAllString(string(text), -1), "\n")))
		})
	}
}

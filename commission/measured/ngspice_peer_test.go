//go:build peer

package measured

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// Sizes are drawn anew for each seed; seed 1 is the stored one.
func TestCausesOnNewChargesSolvedByNgspice(t *testing.T) {
	for _, k := range spiceCases {
		for seed := uint64(1); seed <= 3; seed++ {
			t.Run(fmt.Sprintf("%s/%d", k.name(), seed), func(t *testing.T) {
				table := solved(t, spiceCircuitOf(k, seed))
				if seed == 1 && os.Getenv("CHARGEHAND_UPDATE") == "1" {
					if err := os.MkdirAll("testdata/ngspice", 0o777); err != nil {
						t.Fatal(err)
					}
					if err := os.WriteFile("testdata/ngspice/"+k.name()+".out", table, 0o666); err != nil {
						t.Fatal(err)
					}
				}
				judgeSpice(t, k, spiceCapture(t, table, seed))
			})
		}
	}
}

// solved runs ngspice and gives its table thinned to the record's step.
func solved(t *testing.T, c spiceCircuit) []byte {
	t.Helper()
	folder := t.TempDir()
	table := filepath.Join(folder, "table")
	if err := os.WriteFile(filepath.Join(folder, "charge.cir"), []byte(strings.Replace(c.netlist(), "OUT", table, 1)), 0o666); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
	defer cancel()
	cmd := exec.CommandContext(ctx, "ngspice", "-b", "charge.cir")
	cmd.Dir = folder
	words, err := cmd.CombinedOutput()
	if err != nil {
		t.Fatalf("ngspice -b charge.cir: %v\n%s", err, words)
	}
	text, err := os.ReadFile(table)
	if err != nil {
		t.Fatalf("ngspice wrote no table: %v\n%s", err, words)
	}
	var thin bytes.Buffer
	next := 0.0
	for line := range strings.Lines(string(text)) {
		v := numbers(t, line)
		if len(v) < 5 || v[0] < next {
			continue
		}
		next = v[0] + spiceStep - 1e-6
		for i, x := range v {
			if i > 0 {
				thin.WriteByte(' ')
			}
			fmt.Fprintf(&thin, "%.6g", x)
		}
		thin.WriteByte('\n')
	}
	return thin.Bytes()
}

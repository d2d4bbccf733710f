package findingtest

import (
	"bufio"
	"bytes"
	"os"
	"strconv"
	"strings"
	"testing"
)

// Stored reads what a circuit simulator measured: lines "name = value …" of a stored output. The first line of the netlist
// beside it, NAME.cir, says how the output was made.
func Stored(t testing.TB, path string) map[string]float64 {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return Measured(t, text)
}

// Measured reads the measurements in a simulator's output.
func Measured(t testing.TB, text []byte) map[string]float64 {
	t.Helper()
	measured := map[string]float64{}
	for lines := bufio.NewScanner(bytes.NewReader(text)); lines.Scan(); {
		name, rest, ok := strings.Cut(lines.Text(), "=")
		fields := strings.Fields(rest)
		if name = strings.TrimSpace(name); !ok || len(fields) == 0 || strings.ContainsAny(name, " :") {
			continue
		}
		if v, err := strconv.ParseFloat(fields[0], 64); err == nil {
			measured[name] = v
		}
	}
	if len(measured) == 0 {
		t.Fatal("the simulator's output holds no measurement")
	}
	return measured
}

// Package golden compares what a view draws with a file under testdata. `go test -update` rewrites the files; the
// difference is then read like code.
package golden

import (
	"flag"
	"os"
	"path/filepath"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the golden files under testdata")

// Compare fails the test where got differs from testdata/NAME.golden. Colours are kept in the file as they are sent.
func Compare(t testing.TB, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", name+".golden")
	if *update {
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(got+"\n"), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatalf("%v; run the test with -update to write it", err)
	}
	if got+"\n" != string(want) {
		t.Errorf("%s differs, got\n%s\nwant\n%s", path, got, want)
	}
}

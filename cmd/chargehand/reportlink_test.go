//go:build !windows

package main

import (
	"os"
	"path/filepath"
	"testing"
)

// Making a link needs a privilege on Windows, so this is tried on the other systems.
func TestReportFollowsNoLink(t *testing.T) {
	for _, force := range []bool{false, true} {
		folder := withLog(t)
		other := filepath.Join(t.TempDir(), "precious")
		if err := os.WriteFile(other, []byte("precious"), 0o644); err != nil {
			t.Fatal(err)
		}
		link := filepath.Join(folder, "out.pdf")
		if err := os.Symlink(other, link); err != nil {
			t.Fatal(err)
		}
		args := []string{"report", "--out", "out.pdf", "rehearsal.chlog"}
		if force {
			args = append(args, "--force")
		}
		got := called(folder, args...)
		if text, _ := os.ReadFile(other); string(text) != "precious" {
			t.Errorf("%v wrote through a link (%+v)", args, got)
		}
		if force != isPDF(t, link) {
			t.Errorf("%v = %+v, the link is replaced: %v, want %v", args, got, isPDF(t, link), force)
		}
	}
}

package main

import "testing"

func TestVersionNamesReleaseAndRevision(t *testing.T) {
	defer func(before string) { revision = before }(revision)
	revision = "0123456789ab"
	for _, arg := range []string{"--version", "-v"} {
		if got, want := called(t.TempDir(), arg), "chargehand "+release+" (0123456789ab)\n"; got.code != exitDone || got.out != want {
			t.Errorf("%s = exit %d, %q, want %q", arg, got.code, got.out, want)
		}
	}
}

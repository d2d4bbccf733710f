package main

import "runtime/debug"

// release is the version; a release build sets it.
var release = "1.0.0"

// version is the release and, where the build knows it, the revision.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return release
	}
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" && len(s.Value) >= 12 {
			return release + " (" + s.Value[:12] + ")"
		}
	}
	return release
}

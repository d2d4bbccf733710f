package main

import "runtime/debug"

// release is the version.
var release = "1.0.0"

// revision is the commit that a release build was made from; `.ci/release` sets it.
var revision string

// version is the release and, where the build knows it, the revision.
func version() string {
	if at := builtFrom(); at != "" {
		return release + " (" + at + ")"
	}
	return release
}

func builtFrom() string {
	if revision != "" {
		return revision
	}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return ""
	}
	at, changed := "", ""
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision" && len(s.Value) >= 12:
			at = s.Value[:12]
		case s.Key == "vcs.modified" && s.Value == "true":
			changed = "-changed"
		}
	}
	if at == "" {
		return ""
	}
	return at + changed
}

package main

import (
	"fmt"
	"path/filepath"
	"runtime"
)

// configFolder is where a key lives, stateFolder where the built-in example's logs and the list of recent sites do (XDG Base
// Directory 0.8 on Unix, the local application data on Windows). They are made with mode 0700 when first written to.
func (a *app) configFolder() (string, error) { return a.userFolder("XDG_CONFIG_HOME", ".config") }
func (a *app) stateFolder() (string, error)  { return a.userFolder("XDG_STATE_HOME", ".local/state") }

func (a *app) userFolder(variable, below string) (string, error) {
	// An empty or relative path counts as unset (XDG Base Directory 0.8).
	if v, ok := a.env(variable); ok && filepath.IsAbs(v) {
		return filepath.Join(v, "chargehand"), nil
	}
	if v, ok := a.env("LOCALAPPDATA"); ok && v != "" && runtime.GOOS == "windows" {
		return filepath.Join(v, "chargehand"), nil
	}
	home, ok := a.env("HOME")
	if !ok || home == "" {
		home, ok = a.env("USERPROFILE")
	}
	if !ok || home == "" {
		return "", fmt.Errorf("there is no home folder; set %s", variable)
	}
	return filepath.Join(home, filepath.FromSlash(below), "chargehand"), nil
}

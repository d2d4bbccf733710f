package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"chargehand/commission/chlog"
	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/unattended"
	"chargehand/commission/walk"
	"chargehand/tui/start"
	"chargehand/tui/walkview"
)

// host gives the screens what they need of the world.
type host struct {
	app     *app
	ctx     context.Context
	options walkOptions // for the walks that are opened
}

// Entries lists unfinished logs, the sites in this folder and those seen lately, and the built-in example.
func (h *host) Entries(context.Context) []start.Entry {
	sites := h.sites()
	entries := h.unfinished(sites)
	for _, file := range sites {
		entries = append(entries, start.Entry{Kind: start.Walk, Site: file, Title: title(h.app, file), Detail: file})
	}
	entries = append(entries, start.Entry{Kind: start.Rehearse, Title: "rehearse the built-in example", Detail: "a simulated converter, nothing to connect"})
	for _, file := range sites {
		entries = append(entries, start.Entry{Kind: start.Rehearse, Site: file, Title: "rehearse " + title(h.app, file), Detail: file})
	}
	entries = append(entries, start.Entry{Kind: start.Check, Title: "desk checks of the built-in example"})
	for _, file := range sites {
		entries = append(entries, start.Entry{Kind: start.Check, Site: file, Title: "desk checks of " + title(h.app, file)})
	}
	return entries
}

func title(a *app, file string) string {
	text, err := a.readSmall(file)
	if err == nil {
		if s, _, err := site.Read(file, text); err == nil {
			return s.Name
		}
	}
	return filepath.Base(file)
}

// sites are the site files of the folder, then those seen lately elsewhere.
func (h *host) sites() []string {
	found, _ := filepath.Glob(h.app.path("*.site.toml"))
	for _, file := range h.app.recent() {
		if !slices.Contains(found, file) {
			if _, err := os.Stat(file); err == nil {
				found = append(found, file)
			}
		}
	}
	return found
}

// unfinished are the unsealed logs beside those sites and in the state folder.
func (h *host) unfinished(sites []string) []start.Entry {
	var folders []string
	if state, err := h.app.stateFolder(); err == nil {
		folders = append(folders, state)
	}
	for _, file := range append([]string{h.app.path("x")}, sites...) {
		if dir := filepath.Dir(file); !slices.Contains(folders, dir) {
			folders = append(folders, dir)
		}
	}
	var entries []start.Entry
	for _, folder := range folders {
		logs, _ := filepath.Glob(filepath.Join(folder, "*.chlog"))
		for _, path := range logs {
			if g, ok := glance(path); ok && !g.sealed {
				entries = append(entries, start.Entry{Kind: start.Resume, Log: path, Site: besideLog(path, g.siteFile),
					Title: g.site, Detail: fmt.Sprintf("%s, %s, stopped at %s", filepath.Base(path), g.opened.Mode, g.stopped)})
			}
		}
	}
	slices.Reverse(entries)
	return entries
}

// besideLog is the site file that a log names, where it lies beside it; empty for the built-in example. A log that names another
// folder is not followed there.
func besideLog(log, siteFile string) string {
	if siteFile == site.ExampleName {
		return ""
	}
	return filepath.Join(filepath.Dir(log), filepath.Base(siteFile))
}

// Open opens what was chosen on the start screen.
func (h *host) Open(_ context.Context, chosen start.Entry) (walkview.Session, error) {
	o := h.options
	o.site, o.log = chosen.Site, chosen.Log
	var notes []string
	o.say = func(text string) { notes = append(notes, text) }
	switch chosen.Kind {
	case start.Rehearse:
		o.rehearse = true
	case start.Resume:
		g, ok := glance(chosen.Log)
		if !ok {
			return walkview.Session{}, fmt.Errorf("%s cannot be read", filepath.Base(chosen.Log))
		}
		o.rehearse = g.opened.Mode == record.RehearsalMode
		if o.rehearse {
			o.again(g.opened)
		}
	}
	s, err := h.app.open(h.ctx, o)
	if err != nil {
		return walkview.Session{}, err
	}
	h.app.remember(chosen.Site)
	if err := s.rehearseOn(h.ctx); err != nil {
		return walkview.Session{}, errors.Join(err, s.close())
	}
	return h.session(s, notes), nil
}

// rehearseOn enters a rehearsal's technician anew where the log is gone on with by another throw-away key.
func (s *session) rehearseOn(ctx context.Context) error {
	if s.operator == nil || s.signer == nil || len(s.begun.People()) == 0 {
		return nil
	}
	key := s.signer.Fingerprint()
	first := s.begun.People()[0]
	for _, p := range s.begun.People() {
		if p.Key != nil && *p.Key == key {
			return nil
		}
	}
	_, err := s.run.Submit(ctx, walk.AddPerson{Name: first.Name, Role: first.Role, Organisation: first.Organisation, Key: key})
	return err
}

// again rehearses with what the log was begun with.
func (o *walkOptions) again(opened record.Opened) {
	o.speed = max(opened.Speed, 1)
	if opened.Seed != nil {
		o.seed = *opened.Seed
	}
	for i, d := range opened.Disturb {
		if i > 0 {
			o.disturb += ","
		}
		o.disturb += d
	}
}

func (h *host) session(s *session, notes []string) walkview.Session {
	var operator unattended.Operator
	if s.operator != nil {
		operator = s.operator
	}
	places := map[signal.Name]string{}
	for _, p := range s.papers.registers.Points {
		places[p.Name] = p.Place()
	}
	key := ""
	if s.signer != nil {
		key = s.signer.Fingerprint()
	}
	open := walkview.Session{
		Key:   key,
		Notes: notes, Run: s.run, Operator: operator, Log: s.log, MaxAge: s.maxAge, Pace: s.clock.Pace, Unsigned: s.unsigned,
		Bell: func() { fmt.Fprint(h.app.out, "\a") }, Places: places,
		Check:  func(changed site.Site) []finding.Finding { return desk.Findings(changed, s.papers.registersOrNone()) },
		Move:   s.move,
		Finish: func(ctx context.Context) ([]string, error) { return s.finish(ctx, h.app) },
		Close:  s.close,
	}
	if s.papers.file != "" {
		open.KeepSite = func(text string) (string, error) { return h.app.keepRevision(s.papers.file, text) }
	}
	return open
}

// move goes on with the log in another file.
func (s *session) move(path string) error {
	if err := s.run.MoveLog(context.Background(), path); err != nil {
		return err
	}
	s.log = path
	return nil
}

// keepRevision writes a revised site file beside the old one, which is never touched: wagtail.site.toml becomes
// wagtail.rev1.site.toml, then rev2.
func (a *app) keepRevision(file, text string) (string, error) {
	base, ending := strings.TrimSuffix(file, ".toml"), ".toml"
	if before, ok := strings.CutSuffix(base, ".site"); ok {
		base, ending = before, ".site.toml"
	}
	for n := 1; n < 1000; n++ {
		path := fmt.Sprintf("%s.rev%d%s", base, n, ending)
		err := writeNew(a.path(path), []byte(text))
		if !errors.Is(err, fs.ErrExist) {
			return path, err
		}
	}
	return "", fmt.Errorf("%s has a thousand revisions; clear some away", file)
}

// Check calculates a site's desk findings.
func (h *host) Check(_ context.Context, file string) (site.Site, desk.Sheet, error) {
	p, err := h.app.papers(file)
	if err != nil {
		return site.Site{}, desk.Sheet{}, err
	}
	return p.site, desk.Check(p.site, p.registersOrNone()), nil
}

// glimpse is what a start screen says of a log.
type glimpse struct {
	opened   record.Opened
	site     string
	siteFile string
	stopped  string
	sealed   bool
}

// glance reads a log as far as it is whole.
func glance(path string) (glimpse, bool) {
	f, err := os.Open(path)
	if err != nil {
		return glimpse{}, false
	}
	defer f.Close()
	g := glimpse{stopped: "the beginning"}
	r := chlog.NewReader(f)
	for {
		line, err := r.Next()
		if err != nil {
			var damage *chlog.DamageError
			return g, g.opened.Log != "" && (errors.Is(err, io.EOF) || errors.As(err, &damage) && damage.Torn)
		}
		body, err := line.Decode()
		if err != nil {
			return g, false
		}
		switch b := body.(type) {
		case record.Opened:
			g.opened = b
		case record.File:
			if s, _, err := site.Read(b.Name, []byte(b.Text)); b.Role == "site" && err == nil {
				g.site, g.siteFile = s.Name, b.Name
			}
		case record.Point:
			g.stopped = b.ID
		case record.Seal:
			g.sealed = true
		}
	}
}

// recentFile holds the paths of sites seen lately.
const recentFile = "recent.json"

const mostRecent = 8

func (a *app) recent() []string {
	folder, err := a.stateFolder()
	if err != nil {
		return nil
	}
	text, err := os.ReadFile(filepath.Join(folder, recentFile))
	var files []string
	if err != nil || json.Unmarshal(text, &files) != nil {
		return nil // a convenience only: a list that cannot be read is an empty one
	}
	return files[:min(len(files), mostRecent)]
}

// remember puts a site on the list of those seen lately.
func (a *app) remember(file string) {
	folder, err := a.stateFolder()
	if file == "" || err != nil {
		return
	}
	full, err := filepath.Abs(a.path(file))
	if err != nil {
		return
	}
	files := append([]string{full}, slices.DeleteFunc(a.recent(), func(f string) bool { return f == full })...)
	text, err := json.Marshal(files[:min(len(files), mostRecent)])
	if err == nil && os.MkdirAll(folder, 0o700) == nil {
		_ = writeFile(filepath.Join(folder, recentFile), true, func(w io.Writer) error { // a convenience only
			_, err := w.Write(text)
			return err
		})
	}
}

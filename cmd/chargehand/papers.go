package main

import (
	"fmt"
	"path/filepath"

	"chargehand/commission"
	"chargehand/commission/desk"
	"chargehand/commission/droop"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

// papers are a site file and its map as read: what every command on a site starts from.
type papers struct {
	file, siteText   string
	mapFile, mapText string
	site             site.Site
	registers        registermap.Map
	hasMap           bool
	warnings         []string // of the site file, each with its place
}

// papers reads a site file and the map it names; an empty file is the built-in example.
func (a *app) papers(file string) (papers, error) {
	if file == "" {
		siteText, mapText := site.Example()
		return read(site.ExampleName, siteText, site.ExampleMapName, mapText)
	}
	text, err := a.readSmall(file)
	if err != nil {
		return papers{}, err
	}
	s, warnings, err := site.Read(file, text)
	if err != nil {
		return papers{}, err
	}
	words := warningWords(file, warnings)
	if s.Device == nil || s.Device.Map == "" {
		return papers{file: file, siteText: string(text), site: s, warnings: words}, nil
	}
	mapFile := filepath.Join(filepath.Dir(file), filepath.FromSlash(s.Device.Map))
	mapText, err := a.readSmall(mapFile)
	if err != nil {
		return papers{}, fmt.Errorf("read the map that %s names: %w", file, err)
	}
	p, err := read(file, string(text), mapFile, string(mapText))
	p.warnings = words
	return p, err
}

func warningWords(file string, warnings []site.Warning) []string {
	var words []string
	for _, w := range warnings {
		words = append(words, fmt.Sprintf("%s:%d:%d: %s", file, w.Line, w.Column, w.Text))
	}
	return words
}

func read(file, siteText, mapFile, mapText string) (papers, error) {
	s, _, err := site.Read(file, []byte(siteText))
	if err != nil {
		return papers{}, err
	}
	m, err := registermap.Read(mapFile, []byte(mapText))
	if err != nil {
		return papers{}, err
	}
	return papers{file: file, siteText: siteText, mapFile: mapFile, mapText: mapText, site: s, registers: m, hasMap: true}, nil
}

// unit is the device's Modbus unit identifier; 1 where the site does not say.
func (p papers) unit() uint8 {
	if p.site.Device == nil {
		return 1
	}
	return p.site.Device.UnitID
}

// registersOrNone gives the map as the desk findings want it: none where there is no map.
func (p papers) registersOrNone() droop.Registers {
	if !p.hasMap {
		return nil
	}
	return p.registers
}

// forWalk are the papers as a log keeps them: file names without their folder.
func (p papers) forWalk() commission.Papers {
	return commission.Papers{
		SiteName: filepath.Base(p.file), SiteText: p.siteText, MapName: baseOrNone(p.mapFile), MapText: p.mapText,
		Findings: desk.Check(p.site, p.registersOrNone()).Findings,
	}
}

func baseOrNone(file string) string {
	if file == "" {
		return ""
	}
	return filepath.Base(file)
}

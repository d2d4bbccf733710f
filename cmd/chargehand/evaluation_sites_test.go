package main

import (
	"os"
	"path/filepath"
	"sync"
	"testing"

	"chargehand/commission/capture"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

const sitesFolder = "../../testdata/sites"

func readSite(t testing.TB, name string) site.Site {
	t.Helper()
	file := name + ".site.toml"
	text, err := os.ReadFile(filepath.Join(sitesFolder, file))
	if err != nil {
		t.Fatal(err)
	}
	s, _, err := site.Read(file, text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// wagtailMap serves every site of the evaluation.
var wagtailMap = func() func(t testing.TB) registermap.Map {
	var m registermap.Map
	var err error
	var once sync.Once
	return func(t testing.TB) registermap.Map {
		t.Helper()
		once.Do(func() {
			const file = "wagtail.map.toml"
			var text []byte
			if text, err = os.ReadFile(filepath.Join(sitesFolder, file)); err == nil {
				m, err = registermap.Read(file, text)
			}
		})
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
}()

// evaluationSites are the three of the test data, the built-in one, and variations with other numbers: with and without
// bleeder, auxiliary supply and filter, slower and faster.
func evaluationSites(t testing.TB) []site.Site {
	w, n, o := readSite(t, "wagtail"), readSite(t, "nightjar"), readSite(t, "ouzel")
	text, _ := site.Example()
	example, _, err := site.Read(site.ExampleName, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return []site.Site{w, n, o, example,
		varied(w, "WAG-017 b", func(s *site.Site) { s.Bus.Auxiliary = nil; scaleResistor(s, 0.5) }),
		varied(w, "WAG-017 c", func(s *site.Site) { s.Bus.Bleeders = nil; scaleResistor(s, 1.5) }),
		varied(w, "WAG-017 d", func(s *site.Site) { v := *s.Converter; v.Filter = nil; s.Converter = &v; scaleResistor(s, 2) }),
		varied(n, "NIG-052 b", func(s *site.Site) { scaleResistor(s, 2) }),
		varied(n, "NIG-052 c", func(s *site.Site) {
			s.Source.Kind, s.Source.Capacitance = site.OtherSource, quantity.Entered[quantity.Capacitance]{}
			s.Bus.Bleeders = w.Bus.Bleeders
		}),
		varied(o, "OUZ-303 b", func(s *site.Site) {
			s.Bus.Auxiliary = w.Bus.Auxiliary
			for i := range s.Bus.Capacitances {
				scaleSpread(&s.Bus.Capacitances[i].Value, 0.4)
			}
		}),
	}
}

func varied(s site.Site, reference string, change func(*site.Site)) site.Site {
	s.Reference = reference
	s.Bus.Capacitances = append([]site.Bank(nil), s.Bus.Capacitances...)
	s.Bus.Bleeders = append([]site.Bleeder(nil), s.Bus.Bleeders...)
	change(&s)
	return s
}

func scaleSpread[Q quantity.Scalar](e *quantity.Entered[Q], by float64) {
	e.Low, e.Nominal, e.High = Q(float64(e.Low)*by), Q(float64(e.Nominal)*by), Q(float64(e.High)*by)
}

func scaleResistor(s *site.Site, by float64) {
	scaleSpread(&s.Precharge.Resistance, by)
	s.Precharge.Timeout.Nominal *= quantity.Seconds(max(1, by)) // so that a sound charge ends before it
}

// dischargeSites have bleeders of a few kilohms, so that a fall takes a minute or two.
func dischargeSites(t testing.TB) []site.Site {
	var sites []site.Site
	for i, s := range evaluationSites(t) {
		if len(s.Bus.Bleeders) == 0 || i == 2 { // the slowest of all adds nothing but time
			continue
		}
		sites = append(sites, varied(s, s.Reference+" quick", func(s *site.Site) {
			for k := range s.Bus.Bleeders {
				scaleSpread(&s.Bus.Bleeders[k].Value, 6600/float64(s.Bus.Bleeders[k].Value.Nominal))
			}
		}))
	}
	return sites
}

// siteFor is a site on which a row can be seen.
func siteFor(t testing.TB, r row, k int) (site.Site, bool) {
	all := evaluationSites(t)
	if r.kind == capture.Discharge {
		all = dischargeSites(t)
	}
	var fit []site.Site
	for _, s := range all {
		if r.on == nil || r.on(s) {
			fit = append(fit, s)
		}
	}
	if len(fit) == 0 {
		return site.Site{}, false
	}
	return fit[k%len(fit)], true
}

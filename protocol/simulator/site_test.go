package simulator

import (
	"os"
	"path/filepath"
	"testing"

	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

const sites = "../../testdata/sites"

// known reads one of the sites that several packages share; those without a map of their own use Wagtail's.
func known(t testing.TB, name string) site.Site {
	t.Helper()
	file := name + ".site.toml"
	text, err := os.ReadFile(filepath.Join(sites, file))
	if err != nil {
		t.Fatal(err)
	}
	s, _, err := site.Read(file, text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func wagtail(t testing.TB) site.Site { return known(t, "wagtail") }

func wagtailMap(t testing.TB) registermap.Map {
	t.Helper()
	const file = "wagtail.map.toml"
	text, err := os.ReadFile(filepath.Join(sites, file))
	if err != nil {
		t.Fatal(err)
	}
	m, err := registermap.Read(file, text)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// shown is a signal as a reader of the registers decodes it; it fails where the registers hold no value.
func (b *bench) shown(n signal.Name) float64 {
	b.t.Helper()
	r := b.reading(n)
	if !r.Quality.HasValue() {
		b.t.Fatalf("%s = %s (%s), want a value", n, r.Quality, r.Why)
	}
	return r.Value
}

func (b *bench) reading(n signal.Name) signal.Reading {
	b.t.Helper()
	p, found := b.options.Map.Find(n)
	if !found {
		b.t.Fatalf("the map has no %s", n)
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	image := b.images[0]
	at := image.at(p)
	answer, err := b.block(at.table, at.unit, int(at.address), p.Words())
	if err != nil {
		b.t.Fatal(err)
	}
	return p.Decode(answer)
}

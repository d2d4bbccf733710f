package simulator

import (
	"fmt"
	"hash/fnv"
	"math/rand/v2"
	"strings"

	"chargehand/protocol/circuit"
)

// spot is a place where a hand instrument can be put.
type spot struct {
	name, unit, what string
	read             func(s *Simulator, r circuit.Reading) float64
}

func spots() []spot {
	plain := func(name, unit, what string, read func(r circuit.Reading) float64) spot {
		return spot{name, unit, what, func(_ *Simulator, r circuit.Reading) float64 { return read(r) }}
	}
	return []spot{
		plain("source", "V", "source voltage at the open bypass, after fuse and isolator", func(r circuit.Reading) float64 { return r.SourceVoltage }),
		plain("source-terminals", "V", "source voltage before the fuse", func(r circuit.Reading) float64 { return r.TerminalVoltage }),
		plain("bus", "V", "bus plus to minus", func(r circuit.Reading) float64 { return r.BusVoltage }),
		plain("star-point", "V", "star point to minus", func(r circuit.Reading) float64 { return r.StarVoltage }),
		plain("across-bypass", "V", "voltage across the bypass contactor", func(r circuit.Reading) float64 { return r.SourceVoltage - r.StarVoltage }),
		plain("source-current", "A", "clamp meter on the source cable, positive out of the source", func(r circuit.Reading) float64 { return r.SourceCurrent }),
		plain("bus-current", "A", "clamp meter on the converter's bus cable, positive to the bus", func(r circuit.Reading) float64 { return r.BusCurrent }),
		{"converter-terminals", "V", "bus voltage at the converter", func(s *Simulator, r circuit.Reading) float64 {
			return r.BusVoltage + s.truth.cable*r.BusCurrent
		}},
		{"precharge-resistance", "Ω", "pre-charge resistor, four-wire", func(s *Simulator, r circuit.Reading) float64 {
			return s.truth.plant.Precharge.Resistor * (1 + s.truth.plant.Precharge.Drift*r.ResistorRise)
		}},
		{"bleeder-resistance", "Ω", "bus plus to minus after the banks have charged from the meter", func(s *Simulator, r circuit.Reading) float64 {
			g := s.truth.plant.Bus.Bleeder + s.truth.plant.Bus.LeftOn + s.truth.plant.Bus.Leakage
			if r.Shorted {
				g += s.truth.plant.Bus.ShortConductance
			}
			return 1 / g
		}},
		{"insulation", "Ω", "each pole to earth", func(s *Simulator, _ circuit.Reading) float64 { return s.device.insulation(&s.truth) }},
		{"resistor-temperature", "°C", "surface of the pre-charge resistor", func(s *Simulator, r circuit.Reading) float64 {
			return s.truth.plant.Precharge.Ambient + r.ResistorRise
		}},
		{"capacitance", "F", "all banks on the bus", func(s *Simulator, _ circuit.Reading) float64 { return s.truth.plant.Bus.Capacitance }},
	}
}

// chokeSpot reads "choke-2" (H) and "choke-resistance-2" (Ω).
func (s *Simulator) chokeSpot(what string) (float64, string, bool) {
	for k, c := range s.truth.plant.Chokes {
		switch what {
		case fmt.Sprintf("choke-%d", k+1):
			return c.Inductance, "H", true
		case fmt.Sprintf("choke-resistance-%d", k+1):
			if c.Fault == circuit.Open {
				return 1e7, "Ω", true
			}
			return c.Resistance, "Ω", true
		}
	}
	return 0, "", false
}

// Places are the names that Measure knows, each with what is measured there; "choke-N" and "choke-resistance-N" stand for
// every phase.
func Places() map[string]string {
	m := map[string]string{"choke-N": "inductance of a phase's choke", "choke-resistance-N": "its resistance"}
	for _, p := range spots() {
		m[p.name] = p.what
	}
	return m
}

// instrumentError is the greatest relative error of a hand instrument, common practice for a good multimeter; a current
// by clamp meter has ten times as much.
const instrumentError = 5e-4

// Measure is what a hand instrument reads at a place now. The instrument has one error of its own for each place, from the
// seed, and reads to a tenth of a volt or ampere or to four digits.
func (s *Simulator) Measure(what string) (value float64, unit string, err error) {
	if err := s.catchUp(); err != nil {
		return 0, "", err
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	value, unit, found := s.chokeSpot(what)
	if !found {
		for _, p := range spots() {
			if p.name == what {
				value, unit, found = p.read(s, s.plant.Read()), p.unit, true
			}
		}
	}
	if !found {
		return 0, "", fmt.Errorf("no instrument can be put at %q; there are %s", what, strings.Join(placeNames(), ", "))
	}
	h := fnv.New64a()
	h.Write([]byte(what))
	r := rand.New(rand.NewPCG(uint64(s.options.Seed), h.Sum64()))
	bound := instrumentError
	if unit == "A" {
		bound *= 10
	}
	value *= 1 + bound*(2*r.Float64()-1)
	if unit == "V" || unit == "A" || unit == "°C" {
		value = roundTo(value, 0.1)
	}
	return value, unit, nil
}

func placeNames() []string {
	var names []string
	for _, p := range spots() {
		names = append(names, p.name)
	}
	return append(names, "choke-N", "choke-resistance-N")
}

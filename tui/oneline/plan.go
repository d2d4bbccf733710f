package oneline

import (
	"fmt"
	"slices"
	"strings"

	"chargehand/commission/quantity"
	"chargehand/commission/site"
	"chargehand/tui/theme"
)

// Plan is what of one site is drawn. Its texts are clean; rated values stand as they were typed, without tolerance.
type Plan struct {
	kind          string // "battery"
	plates        plates
	blockingDiode bool
	hasFuse       bool
	fuse          string // rating
	resistor      string
	filter        *filter
	phases        int // 0: not known
	choke         string
	hangers       []hanger
	nearZero      quantity.Current // below this the current has no direction worth naming
}

// plates is how the source is drawn.
type plates uint8

const (
	cell      plates = iota // a long and a short plate
	capacitor               // two equal plates
	box                     // neither
)

type filter struct {
	capacitance string
	atStar      bool
}

// hanger is one thing on the bus.
type hanger struct {
	class       string    // what several of them are called together
	symbol      [2]string // in Unicode and in ASCII, four columns each
	name, value string
}

const choppers = "choppers"

var (
	bankSymbol     = [2]string{"─‖─ ", "-||-"}
	isolatedSymbol = [2]string{"╱ ‖─", "/ ||"}
	feedsSymbol    = [2]string{"◂───", "<---"}
	bothWaysSymbol = [2]string{"◂──▸", "<-->"}
	bleederSymbol  = [2]string{"─[ ]", "-[ ]"}
	chopperSymbol  = [2]string{"╱[ ]", "/[ ]"}
	loadSymbol     = [2]string{"───▸", "--->"}
)

// NewPlan takes from a site what is drawn.
func NewPlan(s site.Site) Plan {
	p := Plan{
		kind:          theme.Clean(string(s.Source.Kind)),
		blockingDiode: s.Source.BlockingDiode,
		resistor:      rated(s.Precharge.Resistance, "Ω"),
		hangers:       hangersOf(s),
		nearZero:      0.1,
	}
	switch s.Source.Kind {
	case "", site.Battery:
		p.kind = "battery"
	case site.Supercapacitor:
		p.plates = capacitor
	case site.OtherSource:
		p.kind, p.plates = "source", box
	default:
		p.plates = box
	}
	if f := s.Source.Fuse; f != nil {
		p.hasFuse, p.fuse = true, rated(f.Rating, "A")
	}
	if c := s.Converter; c != nil {
		p.phases, p.choke = c.Phases, rated(c.Choke, "H")
		if c.Filter != nil {
			p.filter = &filter{rated(c.Filter.Capacitance, "F"), c.Filter.Position != site.AtSource}
		}
		// A quarter of a per cent of the rating is below what a converter's current sensor resolves (common practice).
		p.nearZero = max(p.nearZero, c.RatedCurrent.Nominal/400)
	}
	return p
}

// hangersOf lists what hangs on the bus: first what can feed it, since that is what makes it live. The first infeed is
// the converter itself and is drawn as such.
func hangersOf(s site.Site) []hanger {
	var list []hanger
	for i, f := range s.Infeeds {
		if i == 0 {
			continue
		}
		symbol := feedsSymbol
		if f.Regenerates {
			symbol = bothWaysSymbol
		}
		list = append(list, hanger{class: "infeeds", symbol: symbol, name: theme.Clean(f.Name), value: rated(f.RatedCurrent, "A")})
	}
	for _, b := range s.Bus.Capacitances {
		symbol := bankSymbol
		if b.Isolated {
			symbol = isolatedSymbol
		}
		list = append(list, hanger{class: "banks", symbol: symbol, name: theme.Clean(b.Name), value: rated(b.Value, "F")})
	}
	for _, b := range s.Bus.Bleeders {
		list = append(list, hanger{class: "bleeders", symbol: bleederSymbol, name: theme.Clean(b.Name), value: rated(b.Value, "Ω")})
	}
	if c := s.Bus.Chopper; c != nil {
		list = append(list, hanger{class: choppers, symbol: chopperSymbol, name: "chopper", value: rated(c.Power, "W")})
	}
	if a := s.Bus.Auxiliary; a != nil {
		list = append(list, hanger{class: "loads", symbol: loadSymbol, name: "auxiliary supply", value: rated(a.Power, "W")})
	}
	return list
}

// within is what hangs on the bus in at most so many rows: where there are more, those of one class share a row, and what
// still has none is counted in the last. A chopper that works goes first.
func (p Plan) within(rows int, chopperFirst bool) (list []hanger, more int) {
	list = p.hangers
	if chopperFirst {
		list = slices.Clone(list)
		slices.SortStableFunc(list, func(a, b hanger) int { return rank(a) - rank(b) })
	}
	if len(list) > rows {
		list = grouped(list)
	}
	if len(list) <= rows {
		return list, 0
	}
	return list[:max(rows-1, 0)], len(list) - max(rows-1, 0)
}

func rank(h hanger) int {
	if h.class == choppers {
		return 0
	}
	return 1
}

func grouped(hangers []hanger) []hanger {
	var list []hanger
	count := 0
	for _, h := range hangers { // the classes stand together
		if len(list) > 0 && list[len(list)-1].class == h.class {
			count++
			last := &list[len(list)-1]
			last.name, last.value = fmt.Sprintf("%d %s", count, h.class), ""
			continue
		}
		list, count = append(list, h), 1
	}
	return list
}

// rated is a rated value as it was typed, without its tolerance, and with Ω and µ as they are written on a drawing.
func rated[Q quantity.Scalar](v quantity.Entered[Q], unit string) string {
	text := theme.Clean(v.Text)
	if text == "" {
		if v.Nominal == 0 {
			return ""
		}
		return quantity.Engineering(float64(v.Nominal), unit, 2)
	}
	// A tolerance follows one blank; a minus sign before the number or in an exponent does not.
	for _, sign := range []string{" ±", " +", " -", " −"} {
		text, _, _ = strings.Cut(text, sign)
	}
	number, typed, ok := strings.Cut(text, " ")
	if !ok {
		return text
	}
	typed = strings.Replace(typed, "ohm", "Ω", 1)
	if strings.HasPrefix(typed, "u") {
		typed = "µ" + typed[1:]
	}
	return number + " " + typed
}

func (p Plan) chokes() string {
	switch p.phases {
	case 0:
		return "chokes"
	case 1:
		return "1 choke"
	}
	return fmt.Sprintf("%d chokes", p.phases)
}

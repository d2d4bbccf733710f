package registermap

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"chargehand/commission/signal"
)

// device is a device with a known layout, walked through a few operating points.
type device struct {
	truth   Map
	samples []Sample
}

// randomDevice has 8 to 14 signals in rows as devices have them, like quantities side by side, and other values around.
// A sister table is missing, holds other things, or mirrors the first.
func randomDevice(r *rand.Rand) device {
	var d device
	d.truth = Map{WordOrder: HighFirst, MaxBlock: 100, MaxGap: 8}
	if r.IntN(3) == 0 {
		d.truth.WordOrder = LowFirst
	}
	table := []Table{Holding, Input}[r.IntN(2)]
	names := []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage, signal.SourceCurrent, signal.BusCurrent,
		signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3, signal.Power, signal.ResistorTemperature,
		signal.HeatsinkTemperature, signal.VoltageSetpoint, signal.ChargeLimit, signal.DischargeLimit}
	names = names[:8+r.IntN(7)]
	wide := []Type{I32, F32, F32, U32}[r.IntN(4)]
	address := Address(10 + r.IntN(300))
	for _, n := range names {
		p := Point{Name: n, Table: table, Address: address, WordOrder: d.truth.WordOrder, ByteOrder: HighFirst, Scale: 0.1, UnitFactor: 1}
		signed := n.Unit() != "V" && n != signal.ChargeLimit && n != signal.DischargeLimit
		switch {
		case n == signal.Power || r.IntN(3) == 0:
			if p.Type = wide; wide == U32 && signed {
				p.Type = I32
			}
			p.Scale = []float64{0.1, 0.01, 0.001}[r.IntN(3)]
			if n == signal.Power || p.Type == F32 {
				p.Scale = 1
			}
		case signed:
			p.Type = I16
		default:
			p.Type = U16
		}
		p.SignReversed = signed && r.IntN(6) == 0
		address += Address(p.Words())
		if r.IntN(5) == 0 {
			address += Address(r.IntN(4))
		}
		d.truth.Points = append(d.truth.Points, p)
	}
	d.walk(r, table)
	return d
}

// walk takes samples: at rest, charging, boosting, giving back.
func (d *device) walk(r *rand.Rand, table Table) {
	mirror := r.IntN(3)
	around := map[Address]uint16{}
	for a := range Address(500) {
		around[a] = uint16(r.IntN(2000))
	}
	source := 700 + 100*r.Float64()
	for k := range 4 {
		bus := []float64{0.45 * source, source, 1030, 1010}[k] * (1 + 0.02*r.Float64())
		current := []float64{4.3, -2.1, 180, -95}[k] * (1 + 0.2*r.Float64())
		values := map[signal.Name]float64{signal.BusVoltage: bus, signal.SourceVoltage: source - 0.06*current,
			signal.StarPointVoltage: source - 0.07*current - 1, signal.SourceCurrent: current, signal.BusCurrent: current * source / bus,
			signal.PhaseCurrent1: current/3 + 0.4, signal.PhaseCurrent2: current / 3 * 1.01, signal.PhaseCurrent3: current/3 - 0.7,
			signal.Power: current * source, signal.ResistorTemperature: 31 + 40*r.Float64(), signal.HeatsinkTemperature: 29 + 20*r.Float64(),
			signal.VoltageSetpoint: []float64{900, 1000, 1030, 1050}[k], signal.ChargeLimit: []float64{260, 260, 200, 150}[k],
			signal.DischargeLimit: []float64{400, 380, 300, 250}[k]}
		s := Sample{Words: Words{}, Expected: map[signal.Name]Expected{}}
		for a, w := range around {
			s.Words[Register{1, table, a}] = w
			if mirror == 1 {
				s.Words[Register{1, table.sister(), a}] = w + 1
			}
		}
		for _, p := range d.truth.Points {
			words, err := p.Encode(values[p.Name])
			if err != nil {
				panic(err)
			}
			s.Words.Put(Span{1, p.Table, p.Address, len(words)}, words)
			if mirror == 2 {
				s.Words.Put(Span{1, p.Table.sister(), p.Address, len(words)}, words)
			}
			s.Expected[p.Name] = Expected{Value: values[p.Name] * (1 + 0.0004*(2*r.Float64()-1)),
				Tolerance: 0.0004 * math.Abs(values[p.Name])}
		}
		d.samples = append(d.samples, s)
	}
}

// mistake is one thing wrong in a copy of the truth, and the line that mends it, for each signal it hits.
type mistake struct {
	what string
	mend map[signal.Name]string
}

// spoil makes one mistake that shows: a signal it hits reads wrong in some sample.
func spoil(r *rand.Rand, d device, m *Map) mistake {
	for {
		trial := Map{WordOrder: m.WordOrder, MaxBlock: m.MaxBlock, Points: slices.Clone(m.Points)}
		one := r.IntN(len(trial.Points))
		k := mistake{mend: map[signal.Name]string{}}
		shows := false
		change := func(i int, set func(*Point), line func(Point) string) {
			alone := d.truth.Points[i] // the mistake by itself must show in what is read
			set(&alone)
			fit, _ := fits(alone, 1, d.samples)
			shows = shows || !fit
			k.mend[trial.Points[i].Name] = line(trial.Points[i])
			set(&trial.Points[i])
		}
		every := func(set func(*Point), line func(Point) string, hits func(Point) bool) {
			for i := range trial.Points {
				if hits(trial.Points[i]) {
					change(i, set, line)
				}
			}
		}
		address := func(p Point) string { return fmt.Sprintf("address = %d", p.Address) }
		order := func(p Point) string { return "word_order = " + quoted(p.WordOrder) }
		swap := func(p *Point) {
			if p.WordOrder == LowFirst {
				p.WordOrder = HighFirst
			} else {
				p.WordOrder = LowFirst
			}
		}
		isWide := func(p Point) bool { return p.Words() > 1 }
		off := Address(1)
		if r.IntN(2) == 0 {
			off = 0xFFFF
		}
		switch k.what = []string{"every address", "address", "every word order", "word order", "scale", "sign", "type", "table"}[r.IntN(8)]; k.what {
		case "every address":
			every(func(p *Point) { p.Address += off }, address, func(Point) bool { return true })
		case "address":
			change(one, func(p *Point) { p.Address += off }, address)
		case "every word order":
			every(swap, order, isWide)
		case "word order":
			if !isWide(trial.Points[one]) {
				continue
			}
			change(one, swap, order)
		case "scale":
			f := scales[r.IntN(len(scales))]
			change(one, func(p *Point) { p.Scale = roundScale(p.Scale * f) }, func(p Point) string { return "scale = " + number(p.Scale) })
		case "sign":
			change(one, func(p *Point) { p.SignReversed = !p.SignReversed }, func(p Point) string { return fmt.Sprintf("sign_reversed = %v", p.SignReversed) })
		case "type":
			other := map[Type]Type{U16: I16, I16: U16, U32: I32, I32: U32, F32: I32}
			change(one, func(p *Point) { p.Type = other[p.Type] }, func(p Point) string { return "type = " + quoted(p.Type) })
		case "table":
			change(one, func(p *Point) { p.Table = p.Table.sister() }, func(p Point) string { return "table = " + quoted(p.Table) })
		}
		if shows {
			*m = trial
			return k
		}
	}
}

// names tells whether the diagnosis names the line that mends a signal, alone or among rivals; or the signal agrees as the
// spoilt map has it, so that there is nothing to name.
func (d Diagnosis) names(n signal.Name, line string) bool {
	for _, s := range d.Signals {
		if s.Point.Name != n {
			continue
		}
		if s.Verdict == Agrees {
			return true
		}
		return slices.ContainsFunc(s.Hypotheses, func(h Hypothesis) bool {
			return slices.ContainsFunc(h.Changes, func(c Change) bool { return c.Line() == line })
		})
	}
	return false
}

// TestDiagnoseNamesTheRightLine: 200 random maps with one or two mistakes each; 95 % are to be named.
func TestDiagnoseNamesTheRightLine(t *testing.T) {
	const maps = 200
	named, alone := 0, 0
	missed := map[string]int{}
	for n := range uint64(maps) {
		r := rand.New(rand.NewPCG(n, 9))
		d := randomDevice(r)
		m := Map{WordOrder: d.truth.WordOrder, MaxBlock: 100, Points: slices.Clone(d.truth.Points)}
		mistakes := []mistake{spoil(r, d, &m)}
		if r.IntN(2) == 0 {
			mistakes = append(mistakes, spoil(r, d, &m))
		}
		got := Diagnose(m, 1, d.samples)
		all := true
		for _, k := range mistakes {
			for name, line := range k.mend {
				if !got.names(name, line) {
					all = false
					missed[k.what]++
				}
			}
		}
		single := true
		for _, s := range got.Signals {
			single = single && len(s.Hypotheses) <= 1
			if s.Verdict == Explained && len(s.Hypotheses) > 1 && s.Advice == "" {
				t.Errorf("map %d, %s: %d rivals and no reading to part them", n, s.Point.Name, len(s.Hypotheses))
			}
			hit := slices.ContainsFunc(mistakes, func(k mistake) bool { return k.mend[s.Point.Name] != "" })
			if !hit && s.Verdict != Agrees {
				t.Errorf("map %d: %s is right and is accused: %s", n, s.Point.Name, s.Verdict)
			}
		}
		if all {
			named++
		}
		if all && single {
			alone++
		}
	}
	t.Logf("the right line named in %d of %d maps, in %d of them alone; missed lines by mistake: %v", named, maps, alone, missed)
	if named < maps*95/100 {
		t.Errorf("the right line named in %d of %d maps, want 95 %%", named, maps)
	}
}

func TestDiagnoseNeverAccusesARightMap(t *testing.T) {
	for n := range uint64(400) {
		d := randomDevice(rand.New(rand.NewPCG(n, 10)))
		got := Diagnose(d.truth, 1, d.samples)
		for _, s := range got.Signals {
			if s.Verdict != Agrees || len(s.Hypotheses) > 0 {
				t.Errorf("map %d: %s of a right map = %s, %v", n, s.Point.Name, s.Verdict, s.Hypotheses)
			}
		}
		if len(got.Whole) > 0 {
			t.Errorf("map %d: a right map is explained by %v", n, got.Whole)
		}
	}
}

// TestDiagnoseListsRivals: the cases in which a single answer would be a guess.
func TestDiagnoseListsRivals(t *testing.T) {
	at := func(a Address, w ...uint16) Words {
		words := Words{}
		for x := range Address(20) {
			words[Register{1, Holding, 90 + x}] = 60000 + uint16(x)
		}
		words.Put(Span{1, Holding, a, len(w)}, w)
		return words
	}
	volts := func(v float64, w Words) Sample {
		return Sample{Words: w, Expected: map[signal.Name]Expected{signal.BusVoltage: {Value: v}}}
	}
	p := Point{Name: signal.BusVoltage, Table: Holding, Address: 101, Type: U16, Scale: 0.1, Unit: "V"}
	m := Map{Points: []Point{p}}

	// One register off, three levels: u16 at 100; i16 there fits as well, and says what would part them.
	samples := []Sample{volts(400, at(100, 4000)), volts(700, at(100, 7000)), volts(1000, at(100, 10000))}
	s := Diagnose(m, 1, samples).Signals[0]
	if s.Verdict != Explained || s.Hypotheses[0].Lines()[0] != `address = 100   # reference = "40101"` {
		t.Errorf("one register off = %s %v, want address = 100", s.Verdict, s.Hypotheses)
	}
	if len(s.Certain) != 1 || s.Certain[0].Line() != "address = 100" {
		t.Errorf("certain = %v, want the address, which all rivals share", s.Certain)
	}
	if len(s.Hypotheses) != 2 || !strings.Contains(s.Advice, "below 0 or above 3277") {
		t.Errorf("rivals = %v, advice %q, want u16 and i16, parted below 0 or above 32768 steps of 0.1 V", s.Hypotheses, s.Advice)
	}

	// Two neighbours that read the same cannot be told apart.
	same := []Sample{volts(400, at(100, 4000, 0, 4000)), volts(700, at(100, 7000, 0, 7000)), volts(1000, at(100, 10000, 0, 10000))}
	s = Diagnose(m, 1, same).Signals[0]
	if lines := fmt.Sprint(s.Hypotheses); !strings.Contains(lines, "address = 100") || !strings.Contains(lines, "address = 102") || len(s.Certain) != 0 {
		t.Errorf("like neighbours = %v, certain %v, want both addresses and nothing certain", lines, s.Certain)
	}
	if !strings.Contains(s.Advice, "alone") {
		t.Errorf("advice = %q, want to move the signal alone", s.Advice)
	}

	// A float whose sensor is 3 % off is no map mistake.
	f := Map{Points: []Point{{Name: signal.BusVoltage, Table: Holding, Address: 100, Type: U16, Scale: 0.1}}}
	off := []Sample{volts(412, at(100, 4000)), volts(721, at(100, 7000)), volts(1030, at(100, 10000))}
	if s = Diagnose(f, 1, off).Signals[0]; s.Verdict != Unexplained || !strings.Contains(s.Advice, "sensor") {
		t.Errorf("3 %% off = %s, %q, want unexplained, rather the sensor", s.Verdict, s.Advice)
	}

	// A code for 'no value' that the map does not list.
	c := Map{Points: []Point{{Name: signal.BusVoltage, Table: Holding, Address: 100, Type: U16, Scale: 0.1}}}
	missing := []Sample{volts(400, at(100, 0xFFFF)), volts(700, at(100, 7000)), volts(1000, at(100, 10000))}
	if s = Diagnose(c, 1, missing).Signals[0]; s.Verdict != Explained || s.Hypotheses[0].Lines()[0] != `missing = "FFFF"` {
		t.Errorf("code for no value = %s %v, want missing = \"FFFF\"", s.Verdict, s.Hypotheses)
	}

	// One sample is a suspicion only.
	if s = Diagnose(m, 1, samples[:1]).Signals[0]; s.Enough || !strings.Contains(s.Advice, "3 samples") {
		t.Errorf("one sample: enough %v, %q, want more asked for", s.Enough, s.Advice)
	}
}

func TestDiagnoseFindsAMistakeMadeEverywhere(t *testing.T) {
	d := randomDevice(rand.New(rand.NewPCG(4, 4)))
	m := Map{WordOrder: d.truth.WordOrder, Points: slices.Clone(d.truth.Points)}
	for i := range m.Points {
		m.Points[i].Address++ // a list that counts from 1
	}
	got := Diagnose(m, 1, d.samples)
	if len(got.Whole) == 0 || got.Whole[0].Line != "every address -1" || len(got.Whole[0].Signals) < len(m.Points)-1 {
		t.Errorf("Whole = %v, want every address -1 for nearly all of %d signals", got.Whole, len(m.Points))
	}
}

func TestNeighbourhoodReadsNothingElse(t *testing.T) {
	m := Map{MaxBlock: 20, Points: []Point{{Table: Holding, Address: 1, Type: U16}, {Table: Holding, Address: 100, Type: F64},
		{Table: Coil, Address: 65535, Type: Bit}, {Table: Input, Address: 104, Type: U16, HasUnitID: true, UnitID: 9}}}
	near := func(s Span, a int) bool {
		for _, p := range m.Points {
			if p.unit(1) == s.UnitID && (p.Table == s.Table || p.Table.sister() == s.Table) && a >= int(p.Address)-3 && a < int(p.Address)+p.Words()+3 {
				return true
			}
		}
		return false
	}
	read := map[Register]int{}
	for _, s := range m.Neighbourhood(1) {
		if s.Quantity < 1 || s.end() > 65536 || !s.Table.HasBits() && s.Quantity > 20 {
			t.Errorf("span %v is no request", s)
		}
		for a := int(s.Address); a < s.end(); a++ {
			read[Register{s.UnitID, s.Table, Address(a)}]++
			if !near(s, a) {
				t.Errorf("%s %d of unit %d is no neighbour of a mapped signal", s.Table, a, s.UnitID)
			}
		}
	}
	for _, p := range m.Points {
		for a := max(0, int(p.Address)-3); a < min(65536, int(p.Address)+p.Words()+3); a++ {
			for _, table := range []Table{p.Table, p.Table.sister()} {
				if n := read[Register{p.unit(1), table, Address(a)}]; n != 1 {
					t.Errorf("%s %d is read %d times, want once", table, a, n)
				}
			}
		}
	}
}

func TestUnreadRegistersAreSaid(t *testing.T) {
	m := Map{Points: []Point{{Name: signal.BusVoltage, Table: Holding, Address: 100, Type: U16}}}
	got := Diagnose(m, 1, []Sample{{Words: Words{}, Expected: map[signal.Name]Expected{signal.BusVoltage: {Value: 700}}}})
	if s := got.Signals[0]; s.Verdict != NotRead || !math.IsNaN(s.Value) {
		t.Errorf("Diagnose without registers = %s, %v, want not read", s.Verdict, s.Value)
	}
	if s := Diagnose(m, 1, nil).Signals[0]; s.Verdict != Unasked {
		t.Errorf("Diagnose without samples = %s, want not compared", s.Verdict)
	}
}

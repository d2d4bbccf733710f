package walk_test

import (
	"regexp"
	"slices"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// listed are the points that a careful inspection and test plan for this equipment holds: id, kind (H hold, W witness,
// C check) and ! where it can hurt. common practice, after EN 50110-1 and the makers' usual plans.
const listed = `safe.permit H · safe.sources C! · safe.isolate H! · safe.dead H! · safe.arc C! · safe.stop H · safe.instruments C!
paper.source W · paper.plates C · paper.banks C! · paper.fuse C · paper.switching C! · paper.settings H · paper.findings H
dead.joints W · dead.polarity H! · dead.chokes C · dead.bridge C! · dead.bus H · dead.resistor C · dead.contactors C
dead.discharge C · dead.insulation H! · dead.monitor C · dead.interlocks H · dead.stop H · dead.ready H!
link.answer C · link.zero C · link.known H
charge.source H! · charge.bus-state H! · charge.insulation C · charge.clear H · charge.rise H! · charge.curve W
charge.difference W! · charge.live-bus H! · charge.close H! · charge.after C
rest.sensors W! · rest.margin W · rest.limits C
boost.clear C · boost.first H! · boost.setpoint W · boost.ripple C! · boost.step C
share.couple H! · share.stairs W · share.droop W · share.share W · share.keyed W · share.lost W! · share.regeneration W!
power.sign H · power.accuracy W · power.window W · power.limits W · power.heat C
trip.stop W! · trip.time-out W! · trip.bypass-lost W · trip.voltage W · trip.source W · trip.earth W! · trip.control-loss C
down.order C! · down.discharge W · down.label C · down.dead H!
leave.settings H · leave.plant C · leave.punch C · leave.handover H`

func TestContentHoldsEveryListedPoint(t *testing.T) {
	kinds := map[string]walk.Kind{"H": walk.Hold, "W": walk.Witness, "C": walk.Check}
	state := example(t).state
	for _, entry := range regexp.MustCompile(`[·\n]`).Split(listed, -1) {
		id, kind, _ := strings.Cut(strings.TrimSpace(entry), " ")
		p, ok := state.Point(id)
		if !ok {
			t.Errorf("Point(%s): not in the walk", id)
			continue
		}
		hazard := strings.HasSuffix(kind, "!")
		if want := kinds[strings.TrimSuffix(kind, "!")]; p.Kind != want {
			t.Errorf("%s is a %s point, want %s", id, p.Kind, want)
		}
		if hazard && !p.IsHazardous() {
			t.Errorf("%s has no caution, and it can hurt", id)
		}
	}
}

func TestEveryPointSaysWhatToDoAndCanBeFailed(t *testing.T) {
	seen := map[string]bool{}
	stage := 0
	for _, p := range example(t).state.Points() {
		switch {
		case seen[p.ID]:
			t.Errorf("%s stands twice", p.ID)
		case p.Stage < stage:
			t.Errorf("%s of stage %d stands behind stage %d", p.ID, p.Stage, stage)
		case len(p.By) == 0:
			t.Errorf("%s: nothing says where its reading comes from", p.ID)
		case p.Title == "" || p.Do == "" || p.Expect == "" || p.Otherwise == "" || p.Basis == "":
			t.Errorf("%s lacks a title, what to do, what to expect, what else to do or its basis: %+v", p.ID, p)
		}
		seen[p.ID], stage = true, p.Stage
		for _, c := range p.Accept {
			if c.Low == nil && c.High == nil {
				t.Errorf("%s: %s has no limit, so nothing fails it", p.ID, c.What)
			}
			if c.From == "" {
				t.Errorf("%s: nothing says where the limit of %s comes from", p.ID, c.What)
			}
		}
	}
}

func TestEveryOpenPointIsAssessedAsMissingSomething(t *testing.T) {
	// A point that passes with nothing entered is a tick without a value.
	b := example(t)
	for _, p := range b.state.Points() {
		if got := b.state.Assess(p); got.Result != walk.Open || len(got.Because) == 0 {
			t.Errorf("Assess(%s) with nothing entered = %q %v, want open", p.ID, got.Result, got.Because)
		}
	}
}

func TestEveryNumberInATextHasItsSource(t *testing.T) {
	for _, p := range example(t).state.Points() {
		for _, text := range []string{p.Caution, p.Do, p.Expect, p.Otherwise} {
			for _, gap := range []string{"not decided on paper", "not stated", "{", "}"} {
				if strings.Contains(text, gap) {
					t.Errorf("%s: %q has %q in it", p.ID, text, gap)
				}
			}
		}
	}
}

// plain are numbers that are no figures of a site: counts, shares and standards' numbers.
var plain = regexp.MustCompile(`stage 5|0\.3 time constants|5 % of rated power|1000 V meter|IEC 60364-6: 1 MΩ at 1000 V DC above 500 V nominal`)

func TestNoFigureStandsInTheContentItself(t *testing.T) {
	// A site whose every voltage, current and time differs must leave no figure of the example in any text.
	text, _ := site.Example()
	for _, change := range [][2]string{{`"1130 V"`, `"1131 V"`}, {`"60 V"`, `"58 V"`}, {`"25 V"`, `"24 V"`}, {`"10.5 s"`, `"10.6 s"`}, {`"90 s"`, `"95 s"`}} {
		if !strings.Contains(text, change[0]) {
			t.Fatalf("the example has no %s", change[0])
		}
		text = strings.ReplaceAll(text, change[0], change[1])
	}
	for _, p := range begun(t, text).state.Points() {
		all := plain.ReplaceAllString(strings.Join([]string{p.Caution, p.Do, p.Expect, p.Otherwise}, " "), "")
		for _, old := range []string{"1130 V", "60 V", "25 V", "10.5 s", "90 s"} {
			if regexp.MustCompile(`(^|[^0-9.])` + regexp.QuoteMeta(old)).MatchString(all) {
				t.Errorf("%s still says %q: %s", p.ID, old, all)
			}
		}
	}
}

func TestWhatRestsOnWhat(t *testing.T) {
	state := example(t).state
	for id, rests := range map[string][]string{
		"safe.sources":   {"safe.dead", "safe.stop"},
		"safe.isolate":   {"safe.dead", "safe.stop"},
		"paper.banks":    {"paper.findings", "charge.curve"},
		"paper.plates":   {"paper.findings", "charge.curve"},
		"dead.resistor":  {"paper.findings", "charge.curve"},
		"dead.discharge": {"paper.findings"},
		"dead.polarity":  {"dead.bus", "dead.insulation", "dead.ready", "charge.*"},
		"dead.bridge":    {"dead.bus", "dead.insulation", "dead.ready", "charge.*"},
		"link.known":     {"charge.*", "rest.*", "boost.*", "share.*", "power.*"},
		"rest.sensors":   {"boost.setpoint", "share.droop", "share.share", "power.accuracy"},
		"share.keyed":    {"boost.setpoint", "rest.margin", "share.stairs", "share.droop", "share.share", "share.lost", "share.regeneration", "trip.voltage"},
		"boost.clear":    {"leave.settings"},
		"trip.voltage":   {"leave.settings"},
	} {
		p, _ := state.Point(id)
		for _, want := range rests {
			if !slices.Contains(p.Reopens, want) {
				t.Errorf("%s reopens %v, want %s among them", id, p.Reopens, want)
			}
		}
	}
	for _, p := range state.Points() {
		for _, pattern := range p.Reopens {
			if !slices.ContainsFunc(state.Points(), func(q walk.Point) bool {
				return q.ID == pattern || strings.HasPrefix(q.ID, strings.TrimSuffix(pattern, "*")) && strings.HasSuffix(pattern, ".*")
			}) {
				t.Errorf("%s reopens %s, which is no point", p.ID, pattern)
			}
		}
	}
}

func TestEveryBindingFindingIsOneThatExists(t *testing.T) {
	state := example(t).state
	measured := []string{"measured.precharge", "measured.closing", "measured.discharge", "measured.window", "measured.sensor",
		"measured.setpoint", "measured.droop", "measured.share", "measured.current-mode", "measured.trip"}
	for _, p := range state.Points() {
		for _, id := range p.Findings {
			name, _, _ := strings.Cut(id, ":")
			onPaper := slices.ContainsFunc(state.Desk(), func(f finding.Finding) bool {
				return f.ID == name || strings.HasSuffix(name, ".") && strings.HasPrefix(f.ID, name)
			})
			if !onPaper && !slices.Contains(measured, name) {
				t.Errorf("%s is bound by %s, which nothing makes", p.ID, id)
			}
		}
	}
}

func TestOwnPointsStandInTheirStage(t *testing.T) {
	text, _ := site.Example()
	b := begun(t, text+"\n[[point]]\nid = \"own.torque\"\nstage = 3\nkind = \"hold\"\nwhat = \"Busbar joints\"\naccept = \"40 N m, marked\"\nbasis = \"project sheet 7\"\n")
	p, ok := b.state.Point("own.torque")
	if !ok || p.Stage != 3 || p.Kind != walk.Hold || p.Expect != "40 N m, marked" || p.Basis != "project sheet 7" {
		t.Fatalf("Point(own.torque) = %+v, %v, want a hold of stage 3", p, ok)
	}
	b.passTo("own.torque")
	b.refused(walk.Enter{Stage: 4}, "own.torque is not signed")
}

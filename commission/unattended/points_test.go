package unattended

import (
	"testing"

	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// example is the state of a walk of the built-in example before its first event.
func example() walk.State {
	text, _ := site.Example()
	return walk.State{}.With(walk.Line{Body: record.File{Role: "site", Name: site.ExampleName, Text: text}})
}

func TestEveryOperatedPointIsInTheWalk(t *testing.T) {
	state := example()
	for id := range operations {
		if _, ok := state.Point(id); !ok {
			t.Errorf("operations has %s, which is no point", id)
		}
		if _, both := notRehearsed[id]; both {
			t.Errorf("%s is operated and left out", id)
		}
	}
	for id, because := range notRehearsed {
		p, ok := state.Point(id)
		if !ok || !p.MayOmit || because == "" {
			t.Errorf("notRehearsed has %s: in the walk %v, may be left out %v, because %q", id, ok, p.MayOmit, because)
		}
	}
}

func TestEveryCaptureIsOperatedInARehearsal(t *testing.T) {
	for _, p := range example().Points() {
		if _, ok := operations[p.ID]; p.Capture != "" && !ok {
			t.Errorf("%s arms a capture that nobody operates", p.ID)
		}
		if p.Capture != "" && len(Acts(p.ID)) == 0 {
			t.Errorf("%s arms a capture, and a rehearsing hand has no acts for it", p.ID)
		}
	}
}

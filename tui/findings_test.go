package tui

import (
	"encoding/json"
	"testing"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// A finding that comes back from a log has its result and no workings; the screen shows both.
func TestFindingsOfALogGetTheirWorkingsBack(t *testing.T) {
	text, _ := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	var logged []finding.Finding
	for _, f := range desk.Findings(s, nil) {
		line, err := json.Marshal(f)
		if err != nil {
			t.Fatal(err)
		}
		var back finding.Finding
		if err := json.Unmarshal(line, &back); err != nil {
			t.Fatal(err)
		}
		logged = append(logged, back)
	}
	for i, f := range explained(s, logged) {
		if logged[i].Explanation != nil {
			t.Fatalf("%s came out of its log line with workings, so there is nothing to give back", f.ID)
		}
		if f.ID == "precharge.energy" && (f.Explanation == nil || len(f.Explanation.Steps) == 0) {
			t.Errorf("explained(%s) = %v, want the steps of its calculation", f.ID, f.Explanation)
		}
		if f.Value != logged[i].Value && f.State == finding.Finite {
			t.Errorf("explained(%s) value = %v, want the log's %v", f.ID, f.Value, logged[i].Value)
		}
	}
}

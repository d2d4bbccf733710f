package finding

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"flag"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"unicode"

	"pgregory.net/rapid"
)

var update = flag.Bool("update", false, "rewrite the golden files")

func TestJudge(t *testing.T) {
	for _, row := range []struct {
		name    string
		v       Value
		limit   Limit
		guards  bool
		wanted  float64
		verdict Verdict
		margin  float64
	}{
		{"no limit", Value{1, 2, 3}, Limit{}, true, 0, Info, math.NaN()},
		{"inside", Value{1, 2, 3}, AtMost(4), true, 0, Pass, 1},
		{"on the edge", Value{1, 2, 4}, AtMost(4), true, 0, Pass, 0},
		{"a corner outside", Value{1, 2, 5}, AtMost(4), false, 0, Marginal, -1},
		{"a corner outside, guarding", Value{1, 2, 5}, AtMost(4), true, 0, Fail, -1},
		{"nominal outside", Value{3, 4.5, 5}, AtMost(4), false, 0, Fail, -1},
		{"nearer than wanted", Value{1, 2, 3}, AtMost(4), true, 2, Marginal, 1},
		{"below", Value{1, 2, 3}, AtLeast(2), false, 0, Marginal, -1},
		{"between", Value{1, 2, 3}, Between(0, 3.5), false, 0, Pass, 0.5},
		{"no number", NoValue(), AtMost(4), true, 0, Undecided, math.NaN()},
		{"without bound", Value{1, 2, math.Inf(1)}, AtMost(4), true, 0, Fail, math.Inf(-1)},
	} {
		verdict, margin := Judge(row.v, row.limit, row.guards, row.wanted)
		if verdict != row.verdict || margin != row.margin && !(math.IsNaN(margin) && math.IsNaN(row.margin)) {
			t.Errorf("Judge(%s) = %s, %v, want %s, %v", row.name, verdict, margin, row.verdict, row.margin)
		}
	}
}

func TestWorst(t *testing.T) {
	order := []Verdict{Pass, Marginal, Undecided, Fail}
	for i, a := range order {
		for j, b := range order {
			if got, want := Worst(Info, a, b), order[max(i, j)]; got != want {
				t.Errorf("Worst(info, %s, %s) = %s, want %s", a, b, got, want)
			}
		}
	}
	if got := Worst(Info); got != Pass {
		t.Errorf("Worst(info) = %s, want pass", got)
	}
}

// sample has everything a finding can have.
func sample() Finding {
	f := Finding{ID: "measured.droop", Subject: "aft, \"string\"", Title: "Slope <of> the line", Unit: "V/A", Basis: "V = V0 − d·I",
		Because: []string{"a", "b"}, Remedy: "set it", Captures: []string{"c1"},
		Cause: []Cause{{ID: "droop-mismatch", Score: 0.93, Evidence: []string{"e"}, Confirm: "read it back"}},
		Parts: []Part{{"no-load voltage", "V", Value{1029, 1030, 1031}}, {"nothing", "V", NoValue()}}}
	return f.Judged(Value{0.13, 0.136, 0.14}, Between(0.12, 0.15), 0)
}

// The form of design 6, key for key.
func TestMarshalJSON(t *testing.T) {
	want := `{"id":"measured.droop","subject":"aft, \"string\"","title":"Slope <of> the line","unit":"V/A","state":"finite",` +
		`"value":{"low":0.13,"nominal":0.136,"high":0.14},"parts":[{"name":"no-load voltage","unit":"V","value":{"low":1029,"nominal":1030,"high":1031}},` +
		`{"name":"nothing","unit":"V","value":{"low":null,"nominal":null,"high":null}}],"limit":{"low":0.12,"high":0.15},"margin":0.009999999999999981,` +
		`"verdict":"pass","because":["a","b"],"basis":"V = V0 − d·I","remedy":"set it","captures":["c1"],` +
		`"cause":[{"id":"droop-mismatch","score":0.93,"evidence":["e"],"confirm":"read it back"}]}`
	f := sample()
	f.Margin = 0.009999999999999981
	got, err := f.MarshalJSON()
	if err != nil || string(got) != want {
		t.Errorf("MarshalJSON = %s, %v\nwant %s", got, err, want)
	}
	bare := Finding{ID: "x.y", Unit: "1"}.Lacking("load.power")
	want = `{"id":"x.y","subject":null,"title":"","unit":"1","state":"none","value":{"low":null,"nominal":null,"high":null},"parts":[],` +
		`"limit":{"low":null,"high":null},"margin":null,"verdict":"undecided","because":["load.power"],"basis":"","remedy":""}`
	if got, err := bare.MarshalJSON(); err != nil || string(got) != want {
		t.Errorf("MarshalJSON(undecided) = %s, %v\nwant %s", got, err, want)
	}
}

func someFinding(t *rapid.T) Finding {
	number := func(name string) float64 {
		return rapid.OneOf(rapid.Float64(), rapid.Just(math.NaN()), rapid.Just(math.Inf(1)), rapid.Just(math.Inf(-1))).Draw(t, name)
	}
	f := Finding{ID: rapid.String().Draw(t, "id"), Subject: rapid.String().Draw(t, "subject"), Title: rapid.String().Draw(t, "title"), Unit: "V",
		State: rapid.SampledFrom([]State{Finite, Never, Unlimited, None}).Draw(t, "state"), Verdict: rapid.SampledFrom([]Verdict{Info, Pass, Marginal, Undecided, Fail}).Draw(t, "verdict"),
		Value: Value{number("low"), number("nominal"), number("high")}, Margin: number("margin"), Because: rapid.SliceOf(rapid.String()).Draw(t, "because"),
		Remedy: rapid.String().Draw(t, "remedy")}
	if rapid.Bool().Draw(t, "limited") {
		f.Limit = AtMost(number("limit"))
	}
	for k := range rapid.IntRange(0, 3).Draw(t, "parts") {
		f.Parts = append(f.Parts, Part{rapid.String().Draw(t, "part"), "A", Value{float64(k), number("part"), 3}})
	}
	return f
}

// What is read back writes the same bytes again, whatever numbers and texts it holds.
func TestJSONRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := someFinding(t)
		first, err := f.MarshalJSON()
		if err != nil {
			t.Fatal(err)
		}
		var back Finding
		if err := back.UnmarshalJSON(first); err != nil {
			t.Fatalf("UnmarshalJSON(%s) = %v", first, err)
		}
		second, err := back.MarshalJSON()
		if err != nil || !bytes.Equal(first, second) {
			t.Fatalf("round trip of %s = %s, %v", first, second, err)
		}
	})
}

func TestUnmarshalRefuses(t *testing.T) {
	for _, text := range []string{`{"verdict":"perhaps","state":"finite"}`, `{"verdict":"pass","state":"solid"}`, `{"verdict":"pass"}`, `[]`, ``} {
		var f Finding
		if err := f.UnmarshalJSON([]byte(text)); err == nil {
			t.Errorf("UnmarshalJSON(%s) = nil, want an error", text)
		}
	}
}

func sheet() Sheet {
	s := NewSheet("Ferry Wagtail, aft battery string", "WAG-017", []Finding{
		Finding{ID: "window.source-high", Title: "Source terminal voltage at the top", Unit: "V"}.Stated(Value{839.5, 841.9, 844.3}),
		Finding{ID: "window.margin", Title: "Lowest bus above highest source", Unit: "V", Guards: true, Remedy: "raise the lowest bus voltage by 12.4 V: set infeed.setpoint of \"aft string\" to 1042.4 V (now 1030 V)",
			Because: []string{"margin_fail 20 V governs the limit"}}.Judged(Value{19.6, 20.4, 21.2}, AtLeast(20), 10),
		Finding{ID: "droop.lost-infeed", Subject: "a very long name of a shore rectifier", Title: "Bus after losing an infeed", Unit: "V"}.Without(Fail, "the bus collapses"),
		Finding{ID: "droop.registers", Title: "Raw numbers", Unit: "1"}.Lacking("device.map"),
		sample(),
		{ID: "discharge.touch-safe", Title: "Time to the touch-safe voltage", Unit: "s", State: Never, Value: Value{4, 5, math.Inf(1)}, Limit: AtMost(5), Margin: math.Inf(-1), Verdict: Marginal},
	})
	s.File = "wagtail.site.toml"
	return s
}

func TestSheetVerdictAndOnly(t *testing.T) {
	s := sheet()
	if s.Verdict != Fail {
		t.Errorf("NewSheet.Verdict = %s, want fail", s.Verdict)
	}
	if only := s.Only("discharge."); len(only.Findings) != 1 || only.Verdict != Marginal || only.File != s.File {
		t.Errorf("Only(discharge.) = %d findings, %s, %q, want 1, marginal, the file", len(only.Findings), only.Verdict, only.File)
	}
	if found := s.Find("window.margin"); len(found) != 1 {
		t.Errorf("Find(window.margin) = %d, want 1", len(found))
	}
}

func TestWriteJSONIsOneLine(t *testing.T) {
	var b bytes.Buffer
	if err := sheet().WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	if strings.Count(b.String(), "\n") != 1 || !strings.HasPrefix(b.String(), `{"format":"chargehand-findings/1","site":"Ferry Wagtail, aft battery string","reference":"WAG-017","file":"wagtail.site.toml","verdict":"fail","findings":[{"id":"window.source-high",`) {
		t.Errorf("WriteJSON = %s", b.String())
	}
	if !json.Valid(b.Bytes()) {
		t.Error("WriteJSON = invalid JSON")
	}
	b.Reset()
	if err := (Sheet{}).WriteJSON(&b); err != nil || !strings.Contains(b.String(), `"findings":[]`) {
		t.Errorf("WriteJSON(empty) = %s, %v, want an empty list", b.String(), err)
	}
}

// RFC 4180: CR LF, quoted where needed, the same number of fields in every row.
func TestWriteCSV(t *testing.T) {
	var b bytes.Buffer
	if err := sheet().WriteCSV(&b, true); err != nil {
		t.Fatal(err)
	}
	if strings.Count(b.String(), "\r\n") != strings.Count(b.String(), "\n") {
		t.Error("WriteCSV: a line does not end with CR LF")
	}
	rows, err := csv.NewReader(&b).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 1+6+2 {
		t.Fatalf("WriteCSV = %d rows, want a heading, six findings and two parts", len(rows))
	}
	column := func(row int, name string) string { return rows[row][slices.Index(rows[0], name)] }
	if got := column(2, "nominal"); got != "20.4" {
		t.Errorf("WriteCSV nominal = %q, want 20.4", got)
	}
	if got := column(3, "low"); got != "" {
		t.Errorf("WriteCSV low without value = %q, want empty", got)
	}
	if got := column(5, "subject"); got != `aft, "string"` {
		t.Errorf("WriteCSV subject = %q, want it unchanged", got)
	}
	if got := column(6, "part"); got != "no-load voltage" {
		t.Errorf("WriteCSV part = %q, want no-load voltage", got)
	}
	b.Reset()
	if err := sheet().WriteCSV(&b, false); err != nil || strings.HasPrefix(b.String(), "site,") {
		t.Errorf("WriteCSV(no header) = %.40q, %v", b.String(), err)
	}
}

func TestWriteTableGolden(t *testing.T) {
	for name, o := range map[string]TableOptions{"80": {Width: 80}, "140": {Width: 140}, "80-ascii": {Width: 80, ASCII: true}} {
		var b bytes.Buffer
		if err := sheet().WriteTable(&b, o); err != nil {
			t.Fatal(err)
		}
		path := filepath.Join("testdata", "table-"+name+".golden")
		if *update {
			if err := os.MkdirAll("testdata", 0o755); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(path, b.Bytes(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if b.String() != string(want) {
			t.Errorf("WriteTable(%s) =\n%s\nwant\n%s", name, b.String(), want)
		}
	}
}

// Whatever a finding holds, no line is wider than the terminal, and with ASCII no byte is beyond it.
func TestWriteTableFits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		printable := rapid.StringOf(rapid.RuneFrom(nil, unicode.Latin, unicode.Han, unicode.Nd, unicode.Zs))
		s := NewSheet(printable.Draw(t, "site"), "REF", nil)
		for range rapid.IntRange(0, 4).Draw(t, "n") {
			f := someFinding(t)
			f.ID, f.Subject, f.Title, f.Remedy = "droop."+printable.Draw(t, "id"), printable.Draw(t, "subject"), printable.Draw(t, "title"), printable.Draw(t, "remedy")
			f.Because = nil
			f.Value = Value{rapid.Float64Range(-1e6, 1e6).Draw(t, "v"), 1, 2}
			s.Findings = append(s.Findings, f)
		}
		o := TableOptions{Width: rapid.IntRange(80, 200).Draw(t, "width"), ASCII: rapid.Bool().Draw(t, "ascii")}
		var b bytes.Buffer
		if err := s.WriteTable(&b, o); err != nil {
			t.Fatal(err)
		}
		for _, line := range strings.Split(b.String(), "\n") {
			if width(line) > o.Width {
				t.Fatalf("WriteTable(width %d): %d columns in %q", o.Width, width(line), line)
			}
		}
		if o.ASCII && strings.IndexFunc(b.String(), func(r rune) bool { return r > 126 || r < 32 && r != '\n' }) >= 0 {
			t.Fatalf("WriteTable(ASCII) = %q", b.String())
		}
	})
}

func TestWriteTableStyles(t *testing.T) {
	var b bytes.Buffer
	err := sheet().WriteTable(&b, TableOptions{Style: func(v Verdict, text string) string { return "<" + string(v) + ">" + text + "</>" }})
	if err != nil || !strings.Contains(b.String(), "<fail>✗ fail     </>") || !strings.Contains(b.String(), "<fail>FAIL</>") {
		t.Errorf("WriteTable(styled) = %s, %v", b.String(), err)
	}
}

// The figures show why a verdict fell: 400.04 against 400 is not printed as 400 against 400.
func TestDigits(t *testing.T) {
	f := Finding{Unit: "A"}.Judged(Value{399, 399.5, 400.04}, AtMost(400), 0)
	if got := f.Digits(); Print(400.04, "A", got) == Print(400, "A", got) {
		t.Errorf("Digits = %d, want enough to tell 400.04 from 400", got)
	}
	if got := (Finding{Unit: "A"}.Judged(Value{100, 200, 300}, AtMost(400), 0)).Digits(); got != leastDigits {
		t.Errorf("Digits = %d, want %d", got, leastDigits)
	}
}

func TestMissing(t *testing.T) {
	var m Missing
	m.Need("a", true)
	m.Need("b", false)
	m.Add("c", "b")
	if !slices.Equal(m, Missing{"b", "c"}) {
		t.Errorf("Missing = %v, want [b c]", m)
	}
}

func TestSharesOf(t *testing.T) {
	shares := SharesOf([]string{"a", "b", "c"}, []float64{1, 0, 3})
	if len(shares) != 2 || shares[0] != (Share{"c", 0.75}) || shares[1] != (Share{"a", 0.25}) {
		t.Errorf("SharesOf = %v, want c 0.75, a 0.25", shares)
	}
}

func FuzzUnmarshalJSON(f *testing.F) {
	text, err := sample().MarshalJSON()
	if err != nil {
		f.Fatal(err)
	}
	f.Add(text)
	f.Add([]byte(`{"verdict":"pass","state":"finite","value":{"low":1e308}}`))
	f.Fuzz(func(t *testing.T, text []byte) {
		var one Finding
		if one.UnmarshalJSON(text) != nil {
			return
		}
		if _, err := one.MarshalJSON(); err != nil {
			t.Errorf("MarshalJSON of what was read = %v", err)
		}
	})
}

package capture

import (
	"encoding/json"
	"math"
	"reflect"
	"strings"
	"testing"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/signal"
)

func example() Capture {
	c := Capture{ID: "c1", Kind: Precharge, Stage: "precharge", Attempt: 1, T0: time.Date(2026, 12, 1, 9, 30, 0, 0, time.UTC),
		Channels: []Channel{
			{Name: signal.BusVoltage, Unit: "V", Type: "u16", Scale: 0.1},
			{Name: signal.SourceCurrent, Unit: "A", Type: "i32 low-first", Scale: -0.01},
			{Name: signal.BypassClosed, Type: "bit 3", Scale: 1},
			{Name: signal.Mode, Type: "u16 0=0 4=1 9=2", Scale: 1},
			{Name: signal.SourceVoltage, Unit: "V"}, // an instrument's: no words
		},
		Gaps: []Gap{{From: 100 * time.Millisecond, To: 200 * time.Millisecond, Why: "link"}}}
	for i := range 5 {
		c.Samples = append(c.Samples, Sample{At: time.Duration(i) * 51 * time.Millisecond, Values: []Value{
			{V: float64(1000+i) * 0.1, OK: true, Raw: []uint16{uint16(1000 + i)}},
			{V: 1.5, OK: true, Raw: []uint16{0xFF6A, 0xFFFF}}, // −150 · −0.01
			{V: 1, OK: true, Raw: []uint16{0x0008}},
			{V: 1, OK: true, Raw: []uint16{4}},
			{V: 812.4375 + float64(i)/3, OK: i != 2},
		}})
	}
	return c
}

func TestRecordsComeBack(t *testing.T) {
	c := example()
	parts := Records(c)
	for i := range parts { // through JSON, as the log keeps it
		text, err := json.Marshal(parts[i])
		if err != nil {
			t.Fatal(err)
		}
		parts[i] = record.Capture{}
		if err := json.Unmarshal(text, &parts[i]); err != nil {
			t.Fatal(err)
		}
	}
	back, err := FromRecords(parts)
	if err != nil {
		t.Fatal(err)
	}
	for i, s := range c.Samples {
		if back.Samples[i].At != s.At {
			t.Errorf("sample %d at %v, want %v", i, back.Samples[i].At, s.At)
		}
		for k, v := range s.Values {
			if got := back.Samples[i].Values[k]; got.OK != v.OK || v.OK && math.Abs(got.V-v.V) > 1e-9 {
				t.Errorf("sample %d %s = %+v, want %+v", i, c.Channels[k].Name, got, v)
			}
		}
	}
	if !reflect.DeepEqual(back.Gaps, c.Gaps) || back.ID != c.ID || back.Kind != c.Kind || !back.T0.Equal(c.T0) {
		t.Errorf("FromRecords(Records(c)) = %+v, want %+v", back, c)
	}
}

func TestRecordsHoldWordsAsOnTheWire(t *testing.T) {
	got := string(Records(example())[0].Samples[2])
	if want := `[0.102,[1002],[65386,65535],[8],[4],null]`; got != want {
		t.Errorf("sample line = %s, want %s", got, want)
	}
}

func TestLongCaptureIsKeptInParts(t *testing.T) {
	c := Capture{ID: "c9", Kind: Discharge, Channels: []Channel{{Name: signal.BusVoltage, Type: "u16", Scale: 0.1}}}
	for i := range 200000 {
		c.Samples = append(c.Samples, Sample{At: time.Duration(i) * time.Millisecond, Values: []Value{{V: 5, OK: true, Raw: []uint16{50}}}})
	}
	parts := Records(c)
	if len(parts) < 2 {
		t.Fatalf("Records gave %d parts, want several", len(parts))
	}
	for _, p := range parts {
		text, err := json.Marshal(p)
		if err != nil || len(text) > 4<<20 {
			t.Errorf("part %d has %d bytes, want at most 4 MiB (%v)", p.Part, len(text), err)
		}
	}
	back, err := FromRecords(parts)
	if err != nil || len(back.Samples) != len(c.Samples) {
		t.Errorf("FromRecords = %d samples, %v, want %d", len(back.Samples), err, len(c.Samples))
	}
	if _, err := FromRecords(parts[1:]); err == nil {
		t.Error("FromRecords without the first part: no error, want one")
	}
}

func TestFromRecordsRefuses(t *testing.T) {
	good := Records(example())[0]
	for name, spoil := range map[string]func(*record.Capture){
		"a field too few":       func(r *record.Capture) { r.Samples[0] = json.RawMessage(`[0,[1]]`) },
		"a word too many":       func(r *record.Capture) { r.Samples[0] = json.RawMessage(`[0,[1,2],[1,2],[1],[4],null]`) },
		"an unknown type":       func(r *record.Capture) { r.Signals[0].Type = "u24" },
		"a time without bound":  func(r *record.Capture) { r.Samples[0] = json.RawMessage(`[1e300,[1],[1,2],[1],[4],null]`) },
		"a word above 16 bits":  func(r *record.Capture) { r.Samples[0] = json.RawMessage(`[0,[65536],[1,2],[1],[4],null]`) },
		"a mode without value":  func(r *record.Capture) { r.Samples[0] = json.RawMessage(`[0,[1],[1,2],[1],[5],null]`) },
		"a t0 that is no time":  func(r *record.Capture) { r.T0 = "yesterday" },
		"a gap without a cause": func(r *record.Capture) { r.Gaps[0] = json.RawMessage(`[0,1]`) },
	} {
		bad := good
		bad.Samples = append([]json.RawMessage{}, good.Samples...)
		bad.Gaps = append([]json.RawMessage{}, good.Gaps...)
		bad.Signals = append([]record.CaptureSignal{}, good.Signals...)
		spoil(&bad)
		if _, err := FromRecords([]record.Capture{bad}); err == nil || !strings.HasPrefix(err.Error(), "capture c1") {
			t.Errorf("FromRecords(%s) error = %v, want one that names capture c1", name, err)
		}
	}
}

func TestGapsAreMarkedAndMeasured(t *testing.T) {
	c := Capture{Channels: []Channel{{Name: signal.BusVoltage}}}
	for _, at := range []int{0, 50, 100, 600, 650} {
		c.Samples = append(c.Samples, Sample{At: time.Duration(at) * time.Millisecond, Values: []Value{{V: 1, OK: true}}})
	}
	marked := c.WithGaps(signal.BusVoltage, 200*time.Millisecond, "no answer")
	want := []Gap{{100 * time.Millisecond, 600 * time.Millisecond, "no answer"}}
	if !reflect.DeepEqual(marked.Gaps, want) {
		t.Errorf("WithGaps = %v, want %v", marked.Gaps, want)
	}
	if again := marked.WithGaps(signal.BusVoltage, 200*time.Millisecond, "no answer"); len(again.Gaps) != 1 {
		t.Errorf("WithGaps twice = %v, want the same once", again.Gaps)
	}
	if got := c.LongestGap(signal.BusVoltage, 0, 0.65); math.Abs(got-0.5) > 1e-9 {
		t.Errorf("LongestGap = %g, want 0.5", got)
	}
}

func TestDecimatedKeepsSpikesAndGaps(t *testing.T) {
	c := Capture{Channels: []Channel{{Name: signal.BusVoltage}}}
	for i := range 1000 {
		v := 10.0
		if i == 333 {
			v = 99
		}
		c.Samples = append(c.Samples, Sample{At: time.Duration(i) * time.Millisecond, Values: []Value{{V: v, OK: i < 600 || i >= 800}}})
	}
	dots := c.Decimated(signal.BusVoltage, 0, 1, 10)
	if len(dots) != 10 || dots[3].High != 99 || dots[3].Low != 10 || dots[6].OK || dots[7].OK || !dots[8].OK {
		t.Errorf("Decimated = %+v, want the spike in column 3 and nothing in 6 and 7", dots)
	}
	if got := c.Decimated(signal.BusVoltage, 1, 1, 10); got != nil {
		t.Errorf("Decimated(no width) = %v, want none", got)
	}
}

func FuzzFromRecords(f *testing.F) {
	text, err := json.Marshal(Records(example())[0])
	if err != nil {
		f.Fatal(err)
	}
	f.Add(text)
	f.Fuzz(func(t *testing.T, text []byte) {
		var r record.Capture
		if json.Unmarshal(text, &r) != nil {
			return
		}
		c, err := FromRecords([]record.Capture{r})
		if err != nil {
			return
		}
		if _, err := FromRecords(Records(c)); err != nil {
			t.Errorf("what was read does not come back: %v", err)
		}
	})
}

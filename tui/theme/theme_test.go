package theme

import (
	"regexp"
	"strings"
	"testing"
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/signal"
)

func TestChoose(t *testing.T) {
	type env map[string]string
	never := func() bool { panic("the terminal must not be asked") }
	light := func() bool { return false }
	for _, c := range []struct {
		name, theme string
		env         env
		terminal    bool
		ask         func() bool
		colour      bool
		dark        bool
	}{
		{"none", "none", nil, true, never, false, false},
		{"explicit dark on a pipe", "dark", nil, false, never, true, true},
		{"explicit light wins over NO_COLOR (no-color.org)", "light", env{"NO_COLOR": "1"}, true, never, true, false},
		{"auto on a pipe", "auto", nil, false, never, false, false},
		{"auto with NO_COLOR", "auto", env{"NO_COLOR": "1"}, true, never, false, false},
		{"NO_COLOR that is empty does not count (no-color.org)", "auto", env{"NO_COLOR": "", "COLORFGBG": "15;0"}, true, never, true, true},
		{"dumb terminal", "auto", env{"TERM": "dumb"}, true, never, false, false},
		{"COLORFGBG light", "auto", env{"COLORFGBG": "0;15"}, true, never, true, false},
		{"COLORFGBG with default between", "auto", env{"COLORFGBG": "12;default;8"}, true, never, true, true},
		{"asked", "auto", nil, true, light, true, false},
	} {
		got, err := Choose(c.theme, false, Terminal{c.terminal, func(k string) (string, bool) { v, ok := c.env[k]; return v, ok }, c.ask})
		want := New(Options{Colour: c.colour, Dark: c.dark})
		if err != nil || got.HasColour() != c.colour || got.Paint(Trace, "x") != want.Paint(Trace, "x") {
			t.Errorf("%s: Choose(%q) = %q, %v, want %q", c.name, c.theme, got.Paint(Trace, "x"), err, want.Paint(Trace, "x"))
		}
	}
	if _, err := Choose("pink", false, Terminal{}); err == nil || !strings.Contains(err.Error(), "auto, dark, light or none") {
		t.Errorf("Choose(pink) = %v, want an error that names the themes", err)
	}
}

// Foreground 31, 33, 32, 34 and their bright forms are red, yellow, green and blue (ECMA-48, 8.3.117); the meanings are
// those of IEC 60073.
func TestColoursCarryTheirMeaning(t *testing.T) {
	for _, c := range []struct {
		role Role
		want string
	}{
		{Danger, "31|91"}, {Alarm, "41"}, {Abnormal, "33|93"}, {Withdrawn, "33|93"}, {Unknown, "33|93"},
		{Normal, "32|92"}, {Mandatory, "34|94"},
	} {
		for _, dark := range []bool{true, false} {
			before, _ := New(Options{Colour: true, Dark: dark}).Codes(c.role)
			if !regexp.MustCompile(`[\[;](` + c.want + `)[;m]`).MatchString(before) {
				t.Errorf("Codes(%d), dark %v = %q, want one of %s", c.role, dark, before, c.want)
			}
		}
	}
}

func TestOnlySixteenColours(t *testing.T) {
	allowed := regexp.MustCompile(`^(\x1b\[(0|1|7|3[0-7]|9[0-7]|4[0-7]|10[0-7])(;(0|1|7|3[0-7]|9[0-7]|4[0-7]|10[0-7]))*m)?$`)
	for _, dark := range []bool{true, false} {
		th := New(Options{Colour: true, Dark: dark})
		for role := range roleCount {
			before, after := th.Codes(role)
			if !allowed.MatchString(before) || (before != "" && after != "\x1b[0m") {
				t.Errorf("Codes(%d), dark %v = %q, %q, want attributes and 16 colours only", role, dark, before, after)
			}
		}
	}
	for role := range roleCount {
		if got := (Theme{}).Paint(role, "x"); got != "x" {
			t.Errorf("Paint(%d, x) without colour = %q, want x", role, got)
		}
	}
}

func TestVerdictsDifferWithoutColour(t *testing.T) {
	for _, ascii := range []bool{false, true} {
		th := New(Options{ASCII: ascii})
		seen := map[string]finding.Verdict{}
		for _, v := range []finding.Verdict{finding.Pass, finding.Marginal, finding.Fail, finding.Undecided, finding.Info} {
			sign := th.VerdictSign(v)
			if other, ok := seen[sign]; ok || Width(sign) != 1 {
				t.Errorf("VerdictSign(%s) = %q, want one column and another sign than %s", v, sign, other)
			}
			if !strings.HasSuffix(th.Verdict(v), string(v)) {
				t.Errorf("Verdict(%s) = %q, want the word in it", v, th.Verdict(v))
			}
			seen[sign] = v
		}
	}
}

func TestNumber(t *testing.T) {
	for _, c := range []struct {
		value float64
		unit  string
		want  string
	}{
		{412.62, "V", "412.6 V"}, {-0.04, "A", "0.0 A"}, {-212.4, "A", "−212.4 A"}, {1545, "W", "1.54 kW"}, {12345, "V", "12.3 kV"},
		{9999.96, "V", "10.0 kV"}, {2.1e6, "Ω", "2.10 MΩ"}, {0.136, "V/A", "136 mV/A"}, {39.25, "°C", "39.2 °C"}, {17, "", "17"},
		{1e300, "V", "1.00e+300 V"},
	} {
		if got := (Theme{}).Number(c.value, c.unit); got != c.want {
			t.Errorf("Number(%v, %q) = %q, want %q", c.value, c.unit, got, c.want)
		}
	}
	if got := New(Options{ASCII: true}).Number(-2.1e6, "Ω"); got != "-2.10 Mohm" {
		t.Errorf("Number(-2.1e6, Ω) under ASCII = %q, want -2.10 Mohm", got)
	}
}

func TestShow(t *testing.T) {
	now := time.Date(2026, 12, 1, 14, 2, 11, 0, time.UTC)
	const maxAge = 500 * time.Millisecond
	for _, c := range []struct {
		name     string
		reading  signal.Reading
		unproved bool
		want     string
		role     Role
	}{
		{"good", signal.Reading{Name: signal.BusVoltage, Value: 412.6, At: now, Quality: signal.Good}, false, "412.6 V", Live},
		{"late still counts", signal.Reading{Name: signal.BusVoltage, Value: 412.6, At: now, Quality: signal.Late}, false, "412.6 V", Live},
		{"unproved", signal.Reading{Name: signal.BusVoltage, Value: 412.6, At: now, Quality: signal.Good}, true, "412.6 V?", Unproved},
		{"at the limit", signal.Reading{Name: signal.BusVoltage, Value: 412.6, At: now.Add(-maxAge), Quality: signal.Good}, false, "412.6 V", Live},
		{"just over it", signal.Reading{Name: signal.BusVoltage, Value: 412.6, At: now.Add(-maxAge - 1), Quality: signal.Good}, true, "no value, 500 ms", Withdrawn},
		{"current has a sign", signal.Reading{Name: signal.SourceCurrent, Value: 4.1, At: now, Quality: signal.Good}, false, "+4.1 A", Live},
		{"missing", signal.Reading{Name: signal.BusVoltage, Value: 6553.5, At: now, Quality: signal.Missing}, false, "no value, none sent", Withdrawn},
		{"bad", signal.Reading{Name: signal.BusVoltage, Value: 1, At: now, Quality: signal.Bad}, false, "no value, bad reply", Withdrawn},
		{"frozen", signal.Reading{Name: signal.BusVoltage, Value: 1, At: now, Quality: signal.Frozen}, false, "no value, frozen", Withdrawn},
		{"never", signal.Reading{Name: signal.BusVoltage, Quality: signal.Never}, false, "no value, never read", Withdrawn},
		{"zero value of the type", signal.Reading{}, false, "no value", Withdrawn},
	} {
		got := Theme{}.Show(c.reading, c.unproved, now, maxAge)
		if got.String() != c.want || got.Role != c.role {
			t.Errorf("%s: Show = %q, role %d, want %q, role %d", c.name, got, got.Role, c.want, c.role)
		}
		for width := range 24 {
			text := got.Within(width)
			if Width(text) > width {
				t.Errorf("%s: Within(%d) = %q, wider than that", c.name, width, text)
			}
			if got.HasValue() && text != "" && text != "?" && text != c.want {
				t.Errorf("%s: Within(%d) = %q, want the whole number or none", c.name, width, text)
			}
		}
	}
}

func TestAge(t *testing.T) {
	for d, want := range map[time.Duration]string{
		-1: "from the future", 12 * time.Millisecond: "12 ms", 3490 * time.Millisecond: "3.4 s", 65 * time.Second: "65 s",
		5 * time.Minute: "5 min", 3 * time.Hour: "3 h", 96 * time.Hour: "4 d",
	} {
		if got := Age(d); got != want {
			t.Errorf("Age(%v) = %q, want %q", int64(d), got, want)
		}
	}
}

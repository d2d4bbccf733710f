package measured

import (
	"testing"
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
)

func TestSensorTellsGainFromOffset(t *testing.T) {
	s := readSite(t, "wagtail") // bus: 0.5 % of 1000 V
	tests := []struct {
		name string
		of   []Comparison
		want finding.Verdict
		id   string
	}{
		{"good", []Comparison{{1001, 1000, 0.6}, {0.5, 0, 0.1}}, finding.Pass, ""},
		{"gain", []Comparison{{1040, 1000, 0.6}, {416, 400, 0.3}}, finding.Fail, "sensor-gain"},
		{"offset", []Comparison{{1020, 1000, 0.6}, {420, 400, 0.3}}, finding.Fail, "sensor-offset"},
		{"decade", []Comparison{{100, 1000, 0.6}}, finding.Fail, "scale-tenfold"},
		{"one level only", []Comparison{{1040, 1000, 0.6}}, finding.Fail, "sensor-gain"},
		{"at the limit", []Comparison{{1005, 1000, 0.6}}, finding.Marginal, ""},
		{"poor instrument", []Comparison{{1003, 1000, 8}}, finding.Undecided, ""},
	}
	for _, test := range tests {
		f := Sensor(s, signal.BusVoltage, test.of...)
		if f.Verdict != test.want || test.id != "" && (len(f.Cause) == 0 || f.Cause[0].ID != test.id) {
			t.Errorf("Sensor(%s) = %s, %v, %q, want %s, %s", test.name, f.Verdict, f.Cause, f.Because, test.want, test.id)
		}
	}
	if f := Sensor(s, signal.BusVoltage); f.Verdict != finding.Undecided {
		t.Errorf("Sensor(nothing) = %s, want undecided", f.Verdict)
	}
}

func TestWindow(t *testing.T) {
	s := readSite(t, "wagtail") // wanted 30 V, fails below 20 V
	for _, test := range []struct {
		source, bus quantity.Voltage
		want        finding.Verdict
		id          string
	}{
		{780, 1000, finding.Pass, ""}, {800, 826, finding.Marginal, ""}, {800, 805, finding.Fail, ""}, {400, 1000, finding.Fail, "source-low"}, {-750, 1000, finding.Fail, "source-reversed"},
	} {
		f := Window(s, test.source, test.bus, 0.5, 0.5)
		if f.Verdict != test.want || test.id != "" && f.Cause[0].ID != test.id {
			t.Errorf("Window(%.0f, %.0f) = %s, %v, %q, want %s %s", test.source, test.bus, f.Verdict, f.Cause, f.Because, test.want, test.id)
		}
	}
}

func TestCurrentMode(t *testing.T) {
	s := readSite(t, "wagtail") // 220 kW: ± 4.4 kW
	none := quantity.Current(0)
	for _, test := range []struct {
		name                string
		reference, measured quantity.Power
		limit               *quantity.Current
		want                finding.Verdict
		id                  string
	}{
		{"follows", 50e3, 50.5e3, nil, finding.Pass, ""},
		{"refuses", -50e3, -200, &none, finding.Fail, "charger-refuses"},
		{"turned round", 50e3, -50e3, nil, finding.Fail, "current-reversed"},
		{"limited", 100e3, 60e3, nil, finding.Fail, "limit-too-low"},
	} {
		f := CurrentMode(s, test.reference, test.measured, 50, test.limit)
		if f.Verdict != test.want || test.id != "" && f.Cause[0].ID != test.id {
			t.Errorf("CurrentMode(%s) = %s, %v, %q, want %s %s", test.name, f.Verdict, f.Cause, f.Because, test.want, test.id)
		}
	}
}

func TestTrip(t *testing.T) {
	over := Expectation{Name: "over-voltage", Low: 1124, High: 1136, Within: 100 * time.Millisecond}
	for _, test := range []struct {
		name string
		o    Observation
		want finding.Verdict
	}{
		{"acts", Observation{Value: 1130.5, U: 0.5, Unit: "V", Acted: true, Action: "pulses blocked", Took: 20 * time.Millisecond}, finding.Pass},
		{"does not act", Observation{Unit: "V"}, finding.Fail},
		{"late", Observation{Value: 1130.5, U: 0.5, Unit: "V", Acted: true, Action: "pulses blocked", Took: time.Second}, finding.Fail},
		{"too high", Observation{Value: 1150, U: 0.5, Unit: "V", Acted: true}, finding.Fail},
	} {
		if f := Trip(over, test.o); f.Verdict != test.want {
			t.Errorf("Trip(%s) = %s, %q, want %s", test.name, f.Verdict, f.Because, test.want)
		}
	}
}

package chart

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"chargehand/tui/theme"
)

func labels(a Axis) string {
	var list []string
	for _, t := range a.Ticks(0) {
		list = append(list, t.Label)
	}
	return strings.Join(list, " ")
}

func TestTicksAreRound(t *testing.T) {
	for _, c := range []struct {
		low, high          float64
		cells, least, most int
		want               string
	}{
		{0, 0.5, 60, 8, 20, "0 0.1 0.2 0.3 0.4 0.5"},
		{0, 10.5, 80, 8, 20, "0 2 4 6 8 10"},
		{0, 820, 13, 2, 6, "0 250 500 750 1000"},
		{-150, 150, 13, 2, 6, "-150 -100 -50 0 50 100 150"},
		{3, 3, 10, 2, 6, "2.50 2.75 3.00 3.25 3.50"},
		{math.NaN(), 1, 11, 2, 6, "0 0.2 0.4 0.6 0.8 1.0"},
		{math.Inf(-1), math.Inf(1), 11, 2, 6, "0 0.2 0.4 0.6 0.8 1.0"},
	} {
		a := NewAxis(c.low, c.high, c.cells, c.least, c.most)
		if got := labels(a); got != c.want {
			t.Errorf("NewAxis(%v, %v, %d).Ticks = %s, want %s", c.low, c.high, c.cells, got, c.want)
		}
	}
}

// The laws of an axis: it takes in the range, every tick is a round number on a whole cell, the label says exactly the
// tick's value, and ticks keep their distance.
func TestAxisLaws(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		low := rapid.Float64Range(-1e6, 1e6).Draw(t, "low")
		high := low + rapid.OneOf(rapid.Float64Range(0, 1e-3), rapid.Float64Range(0, 10), rapid.Float64Range(0, 1e6)).Draw(t, "span")
		cells := rapid.IntRange(3, 200).Draw(t, "cells")
		a := NewAxis(low, high, cells, 2, 6)
		slack := (high - low + math.Abs(low)) * 1e-9
		if a.Low() > low+slack || a.High() < high-slack {
			t.Fatalf("NewAxis(%v, %v, %d) runs from %v to %v, want the range inside", low, high, cells, a.Low(), a.High())
		}
		ticks := a.Ticks(0)
		if len(ticks) == 0 {
			t.Fatalf("NewAxis(%v, %v, %d) has no tick", low, high, cells)
		}
		mantissa := a.Step / math.Pow(10, math.Floor(math.Log10(a.Step)+1e-9))
		if !near(mantissa, 1) && !near(mantissa, 2) && !near(mantissa, 2.5) && !near(mantissa, 5) {
			t.Fatalf("NewAxis(%v, %v, %d).Step = %v, want 1, 2, 2.5 or 5 times a power of ten", low, high, cells, a.Step)
		}
		for i, tick := range ticks {
			if got := a.Cell(tick.Value); math.Abs(got-float64(tick.Cell)) > 1e-5 {
				t.Fatalf("Cell(%v) = %v, want the whole cell %d", tick.Value, got, tick.Cell)
			}
			var read float64
			if _, err := fmt.Sscan(tick.Label, &read); err != nil || math.Abs(read-tick.Value) > 1e-9*math.Max(1, math.Abs(tick.Value)) {
				t.Fatalf("label %q reads %v, want %v", tick.Label, read, tick.Value)
			}
			if i > 0 && tick.Cell-ticks[i-1].Cell != a.PerTick {
				t.Fatalf("ticks %d and %d are %d cells apart, want %d", i-1, i, tick.Cell-ticks[i-1].Cell, a.PerTick)
			}
		}
	})
}

func near(a, b float64) bool { return math.Abs(a-b) < 1e-6 }

func TestAxisPrefix(t *testing.T) {
	for _, c := range []struct {
		high float64
		unit string
		want string
	}{
		{1000, "V", "V"}, {12000, "V", "kV"}, {2e7, "W", "MW"}, {0.05, "s", "ms"}, {10, "s", "s"}, {50000, "s", "s"},
		{0.136, "V/A", "mV/A"}, {100, "%", "%"}, {0.01, "1", "1"},
	} {
		_, letter := NewAxis(0, c.high, 20, 2, 6).prefix(c.unit)
		if got := letter + c.unit; got != c.want {
			t.Errorf("prefix(0 … %v %s) = %s, want %s", c.high, c.unit, got, c.want)
		}
	}
}

// plotted parses a drawn chart back: the text before the axis of each row, and what is drawn behind it.
func plotted(t *rapid.T, view string) (labels []string, plot [][]rune) {
	for _, line := range strings.Split(view, "\n")[1:] {
		runes := []rune(line)
		axis := strings.IndexAny(line, "┤│+|")
		if axis < 0 {
			continue
		}
		axis = len([]rune(line[:axis]))
		if strings.ContainsAny(line, "└") || strings.Contains(line, "+---") {
			break
		}
		labels = append(labels, strings.TrimSpace(string(runes[:axis])))
		plot = append(plot, runes[axis+1:])
	}
	return labels, plot
}

var traceSigns = map[Form]string{Braille: "⠁⠂⠄⡀⠈⠐⠠⢀⠉⠒⠤⣀", Block: "▀▄█", ASCII: "*"}

// A level trace at a tick's value is drawn in the row that carries the tick's label and in no other, in every form, at
// every size and for every range.
func TestTraceAtTickStandsInItsRow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		form := rapid.SampledFrom([]Form{Braille, Block, ASCII}).Draw(t, "form")
		low := rapid.Float64Range(-1000, 1000).Draw(t, "low")
		high := low + rapid.Float64Range(0.01, 2000).Draw(t, "span")
		width, height := rapid.IntRange(LeastWidth+8, 140).Draw(t, "width"), rapid.IntRange(LeastHeight+2, 40).Draw(t, "height")
		c := Chart{Form: form, X: Scale{High: 10}, Y: Scale{Low: low, High: high}}
		th := theme.New(theme.Options{ASCII: form == ASCII})
		_, y := c.Axes(th, width, height)
		ticks := y.Ticks(0)
		tick := ticks[rapid.IntRange(0, len(ticks)-1).Draw(t, "tick")]
		c.Traces = []Series{{X: []float64{0, 10}, Y: []float64{tick.Value, tick.Value}}}
		view := c.View(th, width, height)
		rows, plot := plotted(t, view)
		found := false
		for i, row := range plot {
			drawn := strings.ContainsAny(string(row), traceSigns[form])
			want := rows[i] == th.Minus(tick.Label)
			found = found || want
			if drawn != want {
				t.Fatalf("row %q: trace at %v drawn %v, want %v\n%s", rows[i], tick.Value, drawn, want, view)
			}
		}
		if !found {
			t.Fatalf("no row is labelled %s\n%s", tick.Label, view)
		}
	})
}

// brailleHeights maps a dot's sign to its height above the middle of the row, in dots: the rows of a Braille cell from the
// top are dots 1 4, 2 5, 3 6, 7 8 (Unicode, Braille Patterns), and the value of a tick lies on the second.
var brailleHeights = map[rune]int{'⠉': 1, '⠁': 1, '⠈': 1, '⠒': 0, '⠂': 0, '⠐': 0, '⠤': -1, '⠄': -1, '⠠': -1, '⣀': -2, '⡀': -2, '⢀': -2}

// A reader who counts rows and dots between two labels reads back the value that was drawn, to within half a dot.
func TestValueReadsBackFromTheLabels(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		width, height := rapid.IntRange(40, 120).Draw(t, "width"), rapid.IntRange(12, 40).Draw(t, "height")
		high := rapid.Float64Range(0.5, 1200).Draw(t, "high")
		value := rapid.Float64Range(0, 1).Draw(t, "share") * high
		c := Chart{X: Scale{High: 10}, Y: Scale{High: high}, Traces: []Series{{X: []float64{0, 10}, Y: []float64{value, value}}}}
		view := c.View(theme.Theme{}, width, height)
		rows, plot := plotted(t, view)
		var at []int
		var label []float64
		dot := math.NaN()
		for i, row := range plot {
			var v float64
			if _, err := fmt.Sscan(rows[i], &v); err == nil {
				at, label = append(at, i), append(label, v)
			}
			if h, ok := brailleHeights[row[1]]; ok {
				dot = float64(i) - float64(h)/4
			}
		}
		if len(at) < 2 {
			return // one label gives no scale to read by
		}
		last := len(at) - 1
		perRow := (label[0] - label[last]) / float64(at[0]-at[last])
		got := label[0] + perRow*(dot-float64(at[0]))
		if math.IsNaN(got) || math.Abs(got-value) > math.Abs(perRow)/8*(1+1e-6) {
			t.Fatalf("read back %v, want %v within %v\n%s", got, value, math.Abs(perRow)/8, view)
		}
	})
}

// An upright marker at a tick of the level axis stands in the column of the tick's mark.
func TestMomentAtTickStandsInItsColumn(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		form := rapid.SampledFrom([]Form{Braille, Block}).Draw(t, "form")
		high := rapid.Float64Range(0.01, 500).Draw(t, "high")
		width := rapid.IntRange(40, 140).Draw(t, "width")
		c := Chart{Form: form, X: Scale{High: high}, Y: Scale{High: 1}}
		x, _ := c.Axes(theme.Theme{}, width, 12)
		ticks := x.Ticks(0)
		tick := ticks[rapid.IntRange(0, len(ticks)-1).Draw(t, "tick")]
		c.Markers = []Marker{{At: tick.Value, Upright: true}}
		rows := strings.Split(c.View(theme.Theme{}, width, 12), "\n")
		mark := -1
		for i, r := range []rune(rows[3]) {
			if r == '┊' {
				mark = i
			}
		}
		if base := []rune(rows[10]); mark < 0 || base[mark] != '┬' {
			t.Fatalf("marker at %v in column %d, want it on a tick\n%s", tick.Value, mark, strings.Join(rows, "\n"))
		}
	})
}

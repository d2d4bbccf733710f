package form

import (
	"fmt"
	"os"
	"os/exec"
	"strings"
	"testing"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"
	"pgregory.net/rapid"

	"chargehand/tui/golden"
	"chargehand/tui/theme"
)

// ohms is a check like a screen's own: a value with its unit, or what to write.
func ohms(text string) (bool, string) {
	if strings.HasSuffix(text, " Ω") {
		return true, "= " + text
	}
	return false, fmt.Sprintf("%q has no unit: write it behind the number, for example \"33 Ω ±5 %%\"", text)
}

func example() Form {
	return New(DefaultKeyMap(),
		Input("resistance", "pre-charge resistance", "Ω ±%", ohms).WithValue("100 Ω"),
		Input("difference", "closing difference", "V", ohms).WithValue("25"),
		Input("timeout", "time-out", "s", ohms),
		Choice("instrument", "instrument", "hand multimeter", "clamp meter"),
		Note("note", "note").WithValue("seen \x1b[31mred\x1b[0m at the joint 電池"))
}

func press(f Form, keys ...string) (Form, Outcome) {
	outcome := Editing
	for _, k := range keys {
		f, outcome = f.Update(message(k))
	}
	return f, outcome
}

var named = map[string]tea.KeyType{
	"enter": tea.KeyEnter, "esc": tea.KeyEsc, "tab": tea.KeyTab, "shift+tab": tea.KeyShiftTab, "up": tea.KeyUp, "down": tea.KeyDown,
	"left": tea.KeyLeft, "right": tea.KeyRight, "home": tea.KeyHome, "end": tea.KeyEnd, "backspace": tea.KeyBackspace,
	"delete": tea.KeyDelete, "ctrl+w": tea.KeyCtrlW, "ctrl+u": tea.KeyCtrlU, "ctrl+k": tea.KeyCtrlK, "ctrl+v": tea.KeyCtrlV,
	"ctrl+left": tea.KeyCtrlLeft, "ctrl+right": tea.KeyCtrlRight, "f5": tea.KeyF5, "f12": tea.KeyF12, "pgup": tea.KeyPgUp,
	"insert": tea.KeyInsert, "ctrl+@": tea.KeyCtrlAt, "ctrl+c": tea.KeyCtrlC,
}

func message(k string) tea.KeyMsg {
	if kind, ok := named[k]; ok {
		return tea.KeyMsg{Type: kind}
	}
	if k == " " {
		return tea.KeyMsg{Type: tea.KeySpace, Runes: []rune(" ")}
	}
	return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(k)}
}

func paste(text string) tea.KeyMsg {
	return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(text), Paste: true}
}

func TestGolden(t *testing.T) {
	typed, _ := press(example().Focus("difference"), "0")
	for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
		at := fmt.Sprintf("%dx%d", size[0], size[1])
		for suffix, o := range map[string]theme.Options{"": {}, "-colour": {Colour: true, Dark: true}, "-ascii": {ASCII: true}} {
			th := theme.New(o)
			golden.Compare(t, "form-"+at+suffix, typed.View(th, size[0], size[1]))
			golden.Compare(t, "help-"+at+suffix, HelpPage(th, size[0], size[1], "The walk",
				"Shows one point after another: what to do, what to expect, what is measured.", DefaultKeys().FullHelp()))
			golden.Compare(t, "line-"+at+suffix, HelpLine(th, size[0], DefaultKeys().ShortHelp()))
		}
	}
}

// In a country where some libraries count drawing characters double the picture must be the same.
func TestGoldenUnderAnotherLocale(t *testing.T) {
	test := exec.Command(os.Args[0], "-test.run=^TestGolden$")
	test.Env = append(os.Environ(), "LC_ALL=ja_JP.UTF-8", "LANG=ja_JP.UTF-8")
	if out, err := test.CombinedOutput(); err != nil {
		t.Errorf("golden test under LC_ALL=ja_JP.UTF-8: %v\n%s", err, out)
	}
}

func TestEditing(t *testing.T) {
	for _, c := range []struct {
		name, start string
		keys        []string
		want        string
	}{
		{"type at the end", "10", []string{"0", " ", "Ω"}, "100 Ω"},
		{"type at the beginning", "00 Ω", []string{"home", "1"}, "100 Ω"},
		{"in the middle", "10 Ω", []string{"home", "right", "5"}, "150 Ω"},
		{"delete back and forward", "1234", []string{"left", "backspace", "delete"}, "12"},
		{"a letter with its mark is one", "Zoe\u0308", []string{"backspace"}, "Zo"},
		{"a mark joins the letter before", "Zoe", []string{"\u0308", "left", "x"}, "Zoxe\u0308"},
		{"a wide letter is one", "電池", []string{"left", "backspace"}, "池"},
		{"word back", "one two three", []string{"ctrl+w"}, "one two"},
		{"over words", "one two", []string{"ctrl+left", "ctrl+left", "ctrl+right", "!"}, "one! two"},
		{"to the beginning, to the end", "one two", []string{"ctrl+left", "ctrl+u"}, "two"},
		{"to the end", "one two", []string{"home", "ctrl+k"}, ""},
		{"at the edges nothing happens", "1", []string{"home", "left", "backspace", "end", "right", "delete"}, "1"},
		{"no clipboard program", "1", []string{"ctrl+v"}, "1"},
		{"keys without a meaning", "1", []string{"f5", "f12", "pgup", "insert", "ctrl+@", "ctrl+c"}, "1"},
	} {
		f, _ := press(New(DefaultKeyMap(), Input("x", "x", "", nil).WithValue(c.start)), c.keys...)
		if got := f.Value("x"); got != c.want {
			t.Errorf("%s: %q and %v give %q, want %q", c.name, c.start, c.keys, got, c.want)
		}
	}
}

func TestPasteIsMadeHarmless(t *testing.T) {
	f := New(DefaultKeyMap(), Note("a", "a"), Note("b", "b"))
	f, outcome := f.Update(paste("one\ttwo\r\nthree\x1b[2J\u202e"))
	if got, want := f.Value("a"), "one two  three^[[2J<202E>"; got != want || outcome != Editing || f.Focused() != "a" {
		t.Errorf("paste gives %q, %v, focus %s, want %q and the same field", got, outcome, f.Focused(), want)
	}
	f, _ = f.Update(paste(strings.Repeat("電", 5000)))
	if got := len(f.Value("a")); got > mostCharacters {
		t.Errorf("a long paste leaves %d bytes, want at most %d", got, mostCharacters)
	}
}

// A form is a value: what is typed into one does not appear in a copy that was made before.
func TestFormIsAValue(t *testing.T) {
	first := New(DefaultKeyMap(), Note("a", "a").WithValue("abc"))
	second, _ := press(first, "backspace", "x")
	third, _ := press(first, "backspace", "y")
	if first.Value("a") != "abc" || second.Value("a") != "abx" || third.Value("a") != "aby" {
		t.Errorf("three forms hold %q, %q, %q, want abc, abx, aby", first.Value("a"), second.Value("a"), third.Value("a"))
	}
}

func TestMovingAndFinishing(t *testing.T) {
	f := example()
	f, outcome := press(f, "enter")
	if f.Focused() != "difference" || outcome != Editing {
		t.Errorf("Enter on the first field: focus %s, outcome %v, want the next field", f.Focused(), outcome)
	}
	f, _ = press(f, "up", "up")
	if f.Focused() != "note" || !f.TakesText() {
		t.Errorf("Up over the first field: focus %s, want the last", f.Focused())
	}
	f, outcome = press(f, "enter")
	if f.Focused() != "difference" || outcome != Editing || f.IsGood() {
		t.Errorf("Enter on the last field of a wrong form: focus %s, outcome %v, want the first wrong field", f.Focused(), outcome)
	}
	f = f.WithValue("difference", "25 Ω").WithValue("timeout", "1 Ω").Focus("note")
	if f, outcome = press(f, "enter"); outcome != Accepted || !f.IsGood() {
		t.Errorf("Enter on the last field of a good form = %v, want accepted", outcome)
	}
	left, outcome := press(f, "x", "esc")
	if outcome != Left || !strings.HasSuffix(left.Value("note"), "x") {
		t.Errorf("Esc = %v with %q, want left and nothing lost", outcome, left.Value("note"))
	}
	if _, outcome := press(New(DefaultKeyMap()), "enter", "x", "esc"); outcome != Left {
		t.Errorf("Esc in an empty form = %v, want left", outcome)
	}
}

func TestChoice(t *testing.T) {
	f := example().Focus("instrument")
	if f.TakesText() || f.Value("instrument") != "hand multimeter" {
		t.Errorf("a choice begins with %q, takes text %v", f.Value("instrument"), f.TakesText())
	}
	for _, k := range []string{"right", "right", "left", " "} {
		f, _ = press(f, k, "z")
	}
	if got := f.Value("instrument"); got != "hand multimeter" {
		t.Errorf("right, right, left, space give %q, want the first again", got)
	}
	f, _ = press(f, "left")
	if got := f.WithValue("instrument", "no such").Value("instrument"); got != "clamp meter" {
		t.Errorf("a value that is not offered gives %q, want clamp meter kept", got)
	}
}

func TestErrorStandsBesideItsField(t *testing.T) {
	f, _ := press(New(DefaultKeyMap(), Input("r", "resistance", "Ω", ohms)), "3", "3")
	wide := strings.Split(f.View(theme.Theme{}, 140, 10), "\n")
	if len(wide) != 1 || !strings.Contains(wide[0], "33") || !strings.Contains(wide[0], "✗") {
		t.Errorf("View at 140 = %q, want field and error on one line", wide)
	}
	narrow := f.View(theme.Theme{}, 50, 10)
	for _, word := range []string{"33", "✗", "behind", "number,", "example"} {
		if !strings.Contains(narrow, word) {
			t.Errorf("View at 50 lacks %q:\n%s", word, narrow)
		}
	}
	f, _ = press(f, " ", "Ω")
	if view := f.View(theme.Theme{}, 140, 10); strings.Contains(view, "✗") || !strings.Contains(view, "✓ = 33 Ω") {
		t.Errorf("View of a good value = %q", view)
	}
	untouched := New(DefaultKeyMap(), Input("r", "resistance", "Ω", ohms)).View(theme.Theme{}, 140, 10)
	if strings.Contains(untouched, "✗") || !strings.Contains(untouched, "has no unit") {
		t.Errorf("View of an untouched field = %q, want what is wanted, without a cross", untouched)
	}
}

// Any keys and any text at any size: never wider nor higher, never an escape sequence, and the cursor in sight.
func TestAnySizeAndKeys(t *testing.T) {
	var keys []string
	for k := range named {
		keys = append(keys, k)
	}
	anyKey := rapid.OneOf(rapid.SampledFrom(keys), rapid.String(), rapid.SampledFrom([]string{"電", "\u0308", "\x1b[2J", "x"}))
	rapid.Check(t, func(t *rapid.T) {
		f := example().WithValue("note", rapid.String().Draw(t, "note"))
		for range rapid.IntRange(0, 20).Draw(t, "presses") {
			f, _ = press(f, anyKey.Draw(t, "key"))
		}
		width, height := rapid.IntRange(-1, 150).Draw(t, "width"), rapid.IntRange(-1, 12).Draw(t, "height")
		view := f.View(theme.Theme{}, width, height)
		if strings.ContainsAny(view, "\x1b\a\u202e\u009b\r\t") {
			t.Fatalf("View holds an escape sequence: %q", view)
		}
		if view == "" {
			return
		}
		rows := strings.Split(view, "\n")
		if len(rows) > max(height, 0) {
			t.Fatalf("View at %dx%d has %d rows", width, height, len(rows))
		}
		for _, row := range rows {
			if theme.Width(row) != width {
				t.Fatalf("View at %dx%d has a row of %d columns: %q", width, height, theme.Width(row), row)
			}
		}
		if width > 2 && !strings.Contains(view, "▸") {
			t.Fatalf("View at %dx%d does not show the focus:\n%s", width, height, view)
		}
	})
}

// No key of the screens means two things, and none is without a word in the help.
func TestKeysAreUnambiguous(t *testing.T) {
	for name, groups := range map[string][][]key.Binding{"Keys": DefaultKeys().FullHelp(), "KeyMap": DefaultKeyMap().FullHelp()} {
		seen := map[string]string{}
		for _, group := range groups {
			for _, b := range group {
				if b.Help().Key == "" || b.Help().Desc == "" {
					t.Errorf("%s: binding %v has no help", name, b.Keys())
				}
				for _, k := range b.Keys() {
					if other, ok := seen[k]; ok {
						t.Errorf("%s: %q means %q and %q", name, k, other, b.Help().Desc)
					}
					seen[k] = b.Help().Desc
				}
			}
		}
		if seen["ctrl+v"] != "" {
			t.Errorf("%s binds ctrl+v", name)
		}
	}
}

func TestHelpLineNamesWholeEntries(t *testing.T) {
	keys := DefaultKeys().ShortHelp()
	for width := range 100 {
		line := HelpLine(theme.Theme{}, width, keys)
		if theme.Width(line) != width {
			t.Errorf("HelpLine(%d) is %d wide", width, theme.Width(line))
		}
		for _, entry := range strings.Split(strings.TrimSpace(line), "   ") {
			known := entry == "" || entry == "…"
			for _, k := range keys {
				known = known || strings.TrimSuffix(entry, "…") == k.Help().Key+" "+k.Help().Desc
			}
			if !known {
				t.Errorf("HelpLine(%d) holds %q, want whole entries", width, entry)
			}
		}
	}
	keys[0].SetEnabled(false)
	if line := HelpLine(theme.Theme{}, 100, keys); strings.Contains(line, "open") {
		t.Errorf("HelpLine = %q, want no disabled key", line)
	}
}

func BenchmarkView140x40(b *testing.B) {
	f, th := example(), theme.New(theme.Options{Colour: true, Dark: true})
	for b.Loop() {
		f.View(th, 140, 40)
	}
}

package walkview_test

import (
	"bytes"
	"errors"
	"reflect"
	"slices"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
	"chargehand/tui/walkview/walkviewtest"
)

// player presses keys on the walk's screen and carries out what it asks for, as the program would.
type player struct {
	t    *testing.T
	m    walkview.Model
	w    walkviewtest.Walk
	left bool
}

func play(t *testing.T, mode, point string) *player {
	w := walkviewtest.Open(t, mode, point)
	return &player{t: t, w: w, m: walkview.New(w.Session, theme.Theme{}, 80, 24, w.Snapshot(t, walkviewtest.Live(0.8, 795)))}
}

func (p *player) press(keys ...string) *player {
	for _, k := range keys {
		p.send(keyOf(k))
	}
	return p
}

func (p *player) send(msg tea.Msg) *player {
	var cmd tea.Cmd
	p.m, cmd = p.m.Update(msg)
	p.run(cmd)
	fits(p.t, p.m.View(), 80, 24)
	return p
}

func (p *player) typed(text string) *player {
	return p.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(text)})
}

func (p *player) run(cmd tea.Cmd) {
	if cmd == nil {
		return
	}
	msg := cmd()
	if v := reflect.ValueOf(msg); v.IsValid() && v.Kind() == reflect.Slice && v.Type().Elem() == reflect.TypeFor[tea.Cmd]() {
		for i := range v.Len() {
			p.run(v.Index(i).Interface().(tea.Cmd))
		}
		return
	}
	if _, ok := msg.(walkview.Left); ok {
		p.left = true
	}
	if msg != nil {
		p.send(msg)
	}
}

func (p *player) sees(texts ...string) *player {
	p.t.Helper()
	view := p.m.View()
	for _, text := range texts {
		if !strings.Contains(view, text) {
			p.t.Errorf("the screen lacks %q:\n%s", text, view)
		}
	}
	return p
}

// log is the log as it is on disk.
func (p *player) log() string { return string(p.w.Disk.Read(walkviewtest.Log)) }

func TestAPointByKeys(t *testing.T) {
	p := play(t, record.RehearsalMode, "safe.permit")
	p.press("enter").sees("document").typed("PTW-118").press("enter").sees("record", "on disk", "pass and sign")
	p.press("enter").sees("safe.permit passed and signed", "safe.sources")
	for _, want := range []string{`"kind":"reading"`, `PTW-118`, `"kind":"point","body":{"id":"safe.permit","result":"pass"`, `"kind":"sign-off"`} {
		if !strings.Contains(p.log(), want) {
			t.Errorf("the log lacks %s:\n%s", want, p.log())
		}
	}
}

func TestAPreparedTextIsNoTick(t *testing.T) {
	p := play(t, record.RehearsalMode, "safe.permit")
	before := len(p.log())
	p.press("enter", "ctrl+n", "enter", "enter").sees("write what stands for __")
	if len(p.log()) != before {
		t.Fatalf("a prepared text with blanks was recorded:\n%s", p.log()[before:])
	}
	p.typed("118").press("enter").typed("6 pm").press("enter").typed("N. N.").press("enter").sees("on disk")
	if !strings.Contains(p.log(), "permit no. 118, valid until 6 pm, in charge: N. N.") {
		t.Errorf("the filled-in text is not in the log:\n%s", p.log()[before:])
	}
}

// TestWrongKeys presses every key where it has nothing to do: the screen says so, and the log stays as it is.
func TestWrongKeys(t *testing.T) {
	p := play(t, record.SiteMode, "paper.plates")
	before := p.log()
	for _, k := range []string{"o", "h", "x", "k", "s", "i", "z", "ä", "F", "f5", "ctrl+z", "delete", "tab", "[", "]", "home", "end", "ctrl+n", "ctrl+t"} {
		p.press(k)
	}
	p.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("\x1b[2J\x07\n\t"), Paste: true})
	if p.log() != before {
		t.Errorf("wrong keys were recorded:\n%s", strings.TrimPrefix(p.log(), before))
	}
	for _, k := range []string{"n", "p", "u", "d", "v", "w", "m"} {
		p.press(k, "esc")
	}
	if p.log() != before {
		t.Errorf("left prompts were recorded:\n%s", strings.TrimPrefix(p.log(), before))
	}
	p.sees("nothing entered")
}

func TestPastedTextIsHarmless(t *testing.T) {
	p := play(t, record.RehearsalMode, "safe.permit")
	p.press("enter").send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("PTW\x1b]0;x\x07-1\r\nsecond\tline"), Paste: true})
	if strings.ContainsAny(p.m.View(), "\x1b\x07\t") {
		t.Errorf("control characters reach the screen: %q", p.m.View())
	}
	p.press("enter")
	if strings.Contains(p.log(), `\u001b`) || !strings.Contains(p.log(), "second line") {
		t.Errorf("the log has the pasted text as %s", p.log()[len(p.log())-400:])
	}
}

func TestTheFarViewSignsNothing(t *testing.T) {
	p := play(t, record.RehearsalMode, "safe.permit")
	before := p.log()
	p.press("f", "enter", "enter", "n", "u").press("f").sees("safe.permit")
	if p.log() != before {
		t.Errorf("a key in the far view was recorded: %s", strings.TrimPrefix(p.log(), before))
	}
}

func TestThePlantIsOperatedInOrder(t *testing.T) {
	p := play(t, record.RehearsalMode, "charge.rise")
	p.press("o").sees("arm the capture").press("enter").sees("capture armed")
	p.m, _ = p.m.WithSnapshot(<-p.w.Session.Run.Snapshots())
	p.press("o", "o").sees("plant: close the pre-charge")
	if want := []string{"withhold on", "precharge close"}; !slices.Equal(*p.w.Acts, want) {
		t.Fatalf("acts = %q, want %q", *p.w.Acts, want)
	}
	p.press("o").sees("noted for charge.difference")
	if !strings.Contains(p.log(), "difference across the bypass 10.8 V") {
		t.Errorf("what the meter showed is not in the log:\n%s", p.log()[len(p.log())-500:])
	}
	p.press("o").press("esc")
	if got := (*p.w.Acts)[len(*p.w.Acts)-1]; got != "withhold off" || p.left {
		t.Errorf("last act %q, left %v; want withhold off, and no leaving during a capture", got, p.left)
	}
	p.sees("a capture is armed")
}

func TestASiteValueChanges(t *testing.T) {
	p := play(t, record.RehearsalMode, "paper.plates")
	p.press("v", "enter").typed("120 Ω").sees("precharge.time-constant: 1.49 s, was 1.25 s").press("enter").typed("nameplate").press("enter")
	p.sees("revised site file written: example.rev1.site.toml")
	if got := p.m.State().Site().Precharge.Resistance.Text; got != "120 Ω" {
		t.Errorf("resistance = %q, want 120 Ω", got)
	}
	p.press("v", "enter").typed("120").sees("wanted")
}

func TestTheLogGoesOnElsewhere(t *testing.T) {
	p := play(t, record.RehearsalMode, "safe.permit")
	p.w.Disk.FailAt, p.w.Disk.Err = p.w.Disk.Calls()+1, errors.New("no space left on device")
	p.press("enter").typed("PTW-118").press("enter").sees("no space left on device")
	p.m, _ = p.m.WithSnapshot(<-p.w.Session.Run.Snapshots())
	p.sees("NOTHING IS RECORDED", "permit")
	p.w.Disk.FailAt = 0
	p.press("g").sees("other").press("enter")
	p.m, _ = p.m.WithSnapshot(<-p.w.Session.Run.Snapshots())
	p.sees("the log goes on in")
	p.press("enter").typed("PTW-118").press("enter").sees("on disk")
	if moved := p.w.Disk.Read(walkviewtest.Log + ".moved.chlog"); !bytes.Contains(moved, []byte("PTW-118")) {
		t.Errorf("the moved log lacks what was entered after the move:\n%s", moved)
	}
}

// TestHostileNames draws a site whose names try to drive the terminal.
func TestHostileNames(t *testing.T) {
	text, _ := site.Example()
	revised, err := site.Revise([]byte(text), map[string]string{"site.name": "船电池 e\u0301\u0301\u0301 abc 👩‍👩‍👧 " + strings.Repeat("w", 300)})
	if err != nil {
		t.Fatal(err)
	}
	w := walkviewtest.OpenSite(t, record.RehearsalMode, "charge.rise", string(revised))
	s := w.Snapshot(t, walkviewtest.Live(0.8, 795))
	for _, size := range sizes {
		view := walkview.New(w.Session, theme.Theme{}, size[0], size[1], s).View()
		fits(t, view, size[0], size[1])
		if strings.Contains(view, "\u200d") {
			t.Errorf("%d×%d: joining characters reach the screen", size[0], size[1])
		}
	}
}

func TestNoSizeBreaksTheScreen(t *testing.T) {
	w := walkviewtest.Open(t, record.RehearsalMode, "charge.rise")
	s := w.Snapshot(t, walkviewtest.Live(0.8, 795))
	c := walkviewtest.Charging(s.State.Site(), 3e9)
	s.Capture = &c
	m := walkview.New(w.Session, theme.Theme{}, 0, 0, s)
	for width := 0; width <= 200; width += 7 {
		for height := 0; height <= 60; height += 3 {
			for _, k := range []string{"", "f", "?", "n"} {
				n := m.Resized(width, height)
				if k != "" {
					n, _ = n.Update(keyOf(k))
				}
				_ = n.View()
			}
		}
	}
}

func TestBell(t *testing.T) {
	rung := 0
	w := walkviewtest.Open(t, record.RehearsalMode, "charge.rise")
	w.Session.Bell = func() { rung++ }
	s := w.Snapshot(t, walkviewtest.Live(700, 795))
	c := walkviewtest.Charging(s.State.Site(), 2e9)
	s.Capture = &c
	m := walkview.New(w.Session, theme.Theme{}, 80, 24, s)
	step := func(change func(*commission.Snapshot), want int, why string) {
		t.Helper()
		change(&s)
		var cmd tea.Cmd
		if m, cmd = m.WithSnapshot(s); cmd != nil {
			cmd()
		}
		if rung != want {
			t.Errorf("%s: the bell rang %d times, want %d", why, rung, want)
		}
	}
	step(func(s *commission.Snapshot) { s.Live = walkviewtest.Live(772, 795) }, 1, "closing difference reached")
	step(func(s *commission.Snapshot) { s.Link.Up = false }, 2, "link lost")
	step(func(s *commission.Snapshot) { s.Link.Up = true }, 2, "link back")
	m, _ = m.Update(keyOf("b"))
	step(func(s *commission.Snapshot) { s.Link.Up = false }, 2, "bell off")
}

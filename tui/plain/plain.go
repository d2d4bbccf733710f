// Package plain goes the walk line by line, for screen readers and bad links: the same walk by the same rules as the screen,
// with nothing drawn. What would stand on the screen is printed in words, and what would be pressed is typed as a line.
//
// Start at [Walk]. It drives the screen's own model, so that neither can know a rule that the other does not.
package plain

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"reflect"
	"slices"
	"strings"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/walk"
	"chargehand/tui/form"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
)

// columns is how long a line of text is at most.
const columns = 78

// Lines hands in what is typed; it is closed at the end of the input. It ends with ctx once a line or the end has come.
func Lines(ctx context.Context, in io.Reader) <-chan string {
	lines := make(chan string)
	go func() {
		defer close(lines)
		scanner := bufio.NewScanner(in)
		for scanner.Scan() {
			select {
			case lines <- scanner.Text():
			case <-ctx.Done():
				return
			}
		}
	}()
	return lines
}

// Walk goes an open walk until it is left, sealed, or the input ends; the log keeps everything.
func Walk(ctx context.Context, session walkview.Session, lines <-chan string, out io.Writer) error {
	session.Bell = func() { fmt.Fprint(out, "\a") }
	w := &walker{ctx: ctx, session: session, lines: lines, out: out}
	select {
	case first := <-session.Run.Snapshots():
		w.m = walkview.New(session, theme.New(theme.Options{}), columns, 40, first)
	case <-ctx.Done():
		return ctx.Err()
	}
	for _, note := range session.Notes {
		w.print(note)
	}
	w.print("An empty line does the next thing; ? lists what else can be typed; quit leaves, and the log keeps everything.")
	w.show()
	return w.loop()
}

type walker struct {
	ctx     context.Context
	session walkview.Session
	lines   <-chan string
	out     io.Writer
	m       walkview.Model
	alarm   string
	phase   string // what of a capture was said last
	saidAt  time.Time
	left    bool
}

func (w *walker) print(text string) { fmt.Fprintln(w.out, theme.Clean(text)) }

// errEnded says that there is nothing more to read.
var errEnded = errors.New("the input has ended")

func (w *walker) loop() error {
	for !w.left {
		line, err := w.read()
		if errors.Is(err, errEnded) {
			return w.stop()
		}
		if err != nil {
			return err
		}
		w.command(strings.TrimSpace(line))
		if w.m.State().Sealed() != nil {
			w.show()
			return nil
		}
	}
	return nil
}

// stop ends a running capture, so that what it has seen is kept.
func (w *walker) stop() error {
	if w.m.Snapshot().Capture == nil {
		return nil
	}
	_, err := w.session.Run.Submit(w.ctx, walk.StopCapture{})
	return err
}

// read waits for a line, and says meanwhile what cannot wait.
func (w *walker) read() (string, error) {
	for {
		select {
		case s := <-w.session.Run.Snapshots():
			w.take(s)
		case line, ok := <-w.lines:
			if !ok {
				return "", errEnded
			}
			return line, nil
		case <-w.ctx.Done():
			return "", w.ctx.Err()
		}
	}
}

// catchUp takes a snapshot that has come meanwhile: what was recorded may have begun or ended a capture.
func (w *walker) catchUp() {
	select {
	case s := <-w.session.Run.Snapshots():
		w.take(s)
	default:
	}
}

// take takes a snapshot: an alarm is said at once, a running capture now and then, its end once.
func (w *walker) take(s commission.Snapshot) {
	before := w.m.Snapshot()
	var cmd tea.Cmd
	w.m, cmd = w.m.WithSnapshot(s)
	w.run(cmd)
	if alarm := w.m.Alarm(); alarm != w.alarm {
		w.alarm = alarm
		if alarm != "" {
			w.print("! " + w.m.Message())
		}
	}
	if before.Link.Up != s.Link.Up {
		w.print(map[bool]string{true: "the link is up", false: "NO LINK: " + s.Link.Why}[s.Link.Up])
	}
	switch c := s.Capture; {
	case c != nil && (string(c.Phase) != w.phase || s.Now.Sub(w.saidAt) >= 2*time.Second && c.Phase == commission.Running):
		w.phase, w.saidAt = string(c.Phase), s.Now
		words := fmt.Sprintf("%s %.1f s", c.Phase, c.Elapsed.Seconds())
		if n := len(c.Y); n > 0 {
			words += fmt.Sprintf(", bus %.1f V", c.Y[n-1])
		}
		w.print(strings.Join(append([]string{words}, c.SoFar...), ", "))
	case c == nil && w.phase != "":
		w.phase = ""
		w.print("the capture has ended")
		w.show()
	}
}

// show says where the walk stands.
func (w *walker) show() {
	fmt.Fprintln(w.out)
	for _, row := range w.m.Words(columns) {
		if row = strings.TrimRight(row, " "); row != "" {
			fmt.Fprintln(w.out, row)
		}
	}
	w.next()
}

func (w *walker) next() {
	if message := w.m.Message(); message != "" {
		w.print(message)
	}
	if w.m.State().Sealed() == nil {
		fmt.Fprintf(w.out, "[%s] ", w.m.Onward())
	}
}

// words are what may be typed beside the letters of the keys.
var words = map[string]tea.KeyType{
	"": tea.KeyEnter, "next": tea.KeyDown, "back": tea.KeyUp, "stage+": tea.KeyRight, "stage-": tea.KeyLeft,
}

func (w *walker) command(line string) {
	w.catchUp()
	before := w.m.State().NextSeq()
	where := w.m.Words(columns)
	switch kind, isWord := words[line]; {
	case line == "quit":
		w.send(tea.KeyMsg{Type: tea.KeyEsc})
	case line == "?":
		w.help()
	case line == "show":
		w.show()
		return
	case isWord:
		w.send(tea.KeyMsg{Type: kind})
	case len([]rune(line)) == 1 && w.isKey(line):
		w.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(line)})
	default:
		w.print(fmt.Sprintf("%q is nothing to type here; ? lists what is", line))
	}
	if err := w.fill(); err != nil {
		return
	}
	if w.left {
		return
	}
	w.catchUp()
	if w.m.State().NextSeq() != before || !slices.Equal(where, w.m.Words(columns)) && line != "?" {
		w.show()
		return
	}
	w.next()
}

// isKey tells whether a letter is a key that makes sense without a drawing.
func (w *walker) isKey(letter string) bool {
	if strings.Contains("f[]bcl", letter) {
		return false
	}
	return slices.ContainsFunc(w.m.Keys(), func(k [2]string) bool { return k[0] == letter })
}

func (w *walker) help() {
	w.print("(empty)  the next thing")
	for _, k := range w.m.Keys() {
		if w.isKey(k[0]) {
			w.print(k[0] + "        " + k[1])
		}
	}
	w.print("next     the point after; back: the point before; stage+ and stage-: another stage")
	w.print("show     where the walk stands, with the present readings")
	w.print("quit     leaves; the log keeps everything")
}

// fill asks for the fields of an open prompt one by one.
func (w *walker) fill() error {
	for {
		f, title, open := w.m.Form()
		if !open {
			return nil
		}
		fmt.Fprintln(w.out)
		w.print(title)
		w.print(w.hint())
		if err := w.fields(f); err != nil {
			return err
		}
	}
}

func (w *walker) hint() string {
	prepared, fills := w.m.Help()
	hint := "Empty keeps what stands in brackets, . goes back and enters nothing"
	if prepared != "" {
		hint += ", / begins with: " + prepared
	}
	if fills {
		hint += ", * reads the simulated plant"
	}
	return hint
}

// fields asks for each field until all are good, then takes the form over.
func (w *walker) fields(f form.Form) error {
	for _, field := range f.Fields() {
		for {
			f, _, _ = w.m.Form()
			now, _ := f.Field(field.ID)
			w.ask(now)
			line, err := w.read()
			if err != nil {
				return err
			}
			if done := w.answer(f, now, strings.TrimSpace(line)); done {
				break
			}
			if _, _, open := w.m.Form(); !open {
				return nil
			}
		}
	}
	var cmd tea.Cmd
	w.m, cmd = w.m.Accept()
	w.run(cmd)
	return nil
}

func (w *walker) ask(field form.Field) {
	label := theme.Clean(field.Label)
	if options := field.Options(); options != nil {
		for i, option := range options {
			w.print(fmt.Sprintf("  %d %s", i+1, option))
		}
		label += ", its number"
	} else if field.Unit != "" {
		label += " in " + field.Unit
	}
	fmt.Fprintf(w.out, "%s [%s]: ", label, theme.Clean(field.Value()))
}

// answer takes one line for a field; it tells whether the field is done.
func (w *walker) answer(f form.Form, field form.Field, line string) bool {
	switch {
	case line == "?":
		w.print(w.hint())
		return false
	case line == ".":
		w.send(tea.KeyMsg{Type: tea.KeyEsc})
		return false
	case line == "*":
		w.send(tea.KeyMsg{Type: tea.KeyCtrlT})
		return false
	case line == "/":
		w.send(tea.KeyMsg{Type: tea.KeyCtrlN})
		return false
	case line != "" && field.Options() != nil:
		var n int
		if _, err := fmt.Sscan(line, &n); err != nil || n < 1 || n > len(field.Options()) {
			w.print("type the number of one of them")
			return false
		}
		line = field.Options()[n-1]
	case line != "" && strings.Contains(field.Value(), form.Blank):
		line = strings.Replace(field.Value(), form.Blank, line, 1)
	}
	if line != "" {
		f = f.WithValue(field.ID, line)
	}
	w.m = w.m.WithForm(f)
	now, _ := f.Field(field.ID)
	if ok, message := now.Verdict(); !ok {
		if line == "" || !strings.Contains(now.Value(), form.Blank) { // the next blank is asked for without a word
			w.print("refused: " + message)
		}
		return false
	}
	for _, moved := range w.m.Previewed() {
		w.print("  " + moved)
	}
	return true
}

// send gives the model a message and carries out what it asks for.
func (w *walker) send(msg tea.Msg) {
	var cmd tea.Cmd
	w.m, cmd = w.m.Update(msg)
	w.run(cmd)
}

func (w *walker) run(cmd tea.Cmd) {
	if cmd == nil {
		return
	}
	msg := cmd()
	if v := reflect.ValueOf(msg); v.IsValid() && v.Kind() == reflect.Slice && v.Type().Elem() == reflect.TypeFor[tea.Cmd]() {
		for i := range v.Len() { // several, in a batch or one after the other
			w.run(v.Index(i).Interface().(tea.Cmd))
		}
		return
	}
	switch msg.(type) {
	case nil:
	case walkview.Left:
		w.left = true
	default:
		w.send(msg)
	}
}

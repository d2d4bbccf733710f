package walkview

import (
	"fmt"
	"strings"
	"time"

	"github.com/charmbracelet/bubbles/key"
	"github.com/charmbracelet/x/ansi"

	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/form"
	"chargehand/tui/oneline"
	"chargehand/tui/theme"
)

// stagesWidth is the column of the stages; in a wide terminal it has room for their titles in full.
const (
	stagesNarrow = 22
	stagesMiddle = 25
	stagesWide   = 36
	middle       = 100
	wide         = 120
)

// View draws the screen in exactly its size.
func (m Model) View() string {
	switch {
	case m.width <= 0 || m.height <= 0:
		return ""
	case m.explain:
		return m.frame(m.explanation())
	case m.done != nil:
		return m.frame(m.ending())
	case m.far:
		return m.farView()
	}
	return m.frame(m.body())
}

// frame puts a body between the title line and the key line.
func (m Model) frame(body []string) string {
	rows := append([]string{m.titleLine()}, body...)
	for len(rows) < m.height-1 {
		rows = append(rows, "")
	}
	rows = append(rows[:max(m.height-1, 0)], m.keyLine())
	for i, row := range rows {
		rows[i] = m.theme.Clip(row, m.width)
	}
	return strings.Join(rows, "\n")
}

// titleLine says which walk this is, whether it is a rehearsal, and what the link is worth.
func (m Model) titleLine() string {
	state := m.snapshot.State
	left := " " + theme.Clean(state.Site().Name)
	if r := state.Site().Reference; r != "" {
		left += m.theme.Pick(" · ", " - ") + theme.Clean(r)
	}
	right := m.linkWords() + "  " + m.snapshot.Now.Format(time.TimeOnly) + " "
	mark := ""
	if state.IsRehearsal() {
		mark = "  " + m.theme.Paint(theme.Hazard, " REHEARSAL ")
		if m.session.Pace != nil && m.session.Pace() > 1 {
			mark += m.theme.Paint(theme.Abnormal, fmt.Sprintf(" x%.0f", m.session.Pace()))
		}
	}
	space := m.width - theme.Width(left) - theme.Width(mark) - theme.Width(right)
	if space < 1 {
		left = m.theme.Clip(left, max(8, theme.Width(left)+space-1))
		space = max(1, m.width-theme.Width(left)-theme.Width(mark)-theme.Width(right))
	}
	return m.theme.Paint(theme.Title, left) + mark + strings.Repeat(" ", space) + right
}

func (m Model) linkWords() string {
	link := m.snapshot.Link
	if link.Up {
		words := fmt.Sprintf("link good %.0f/s", link.Rate)
		if age, ok := m.newestAge(); ok {
			words += m.theme.Pick(" · ", " - ") + "age " + theme.Age(age)
		}
		return m.theme.Paint(theme.Normal, words)
	}
	words := "NO LINK"
	if wait := link.NextTry.Sub(m.snapshot.Now); !link.NextTry.IsZero() && wait > 0 {
		words += fmt.Sprintf(", next try in %.0f s", wait.Seconds())
	}
	return m.theme.Paint(theme.Alarm, " "+words+" ")
}

func (m Model) newestAge() (time.Duration, bool) {
	age, ok := time.Duration(0), false
	for _, r := range m.snapshot.Live {
		if r.Quality.HasValue() && (!ok || r.Age(m.snapshot.Now) < age) {
			age, ok = r.Age(m.snapshot.Now), true
		}
	}
	return max(age, 0), ok
}

// maxAge is how old a reading may be by the plant's clock.
func (m Model) maxAge() time.Duration {
	if m.session.Pace == nil {
		return m.session.MaxAge
	}
	return time.Duration(float64(m.session.MaxAge) * m.session.Pace())
}

// body is the drawing, the stages and the open point.
func (m Model) body() []string {
	drawing := m.drawing()
	rule := m.rule()
	rows := append([]string{rule}, drawing...)
	rows = append(rows, rule)
	height := max(m.height-len(rows)-3, 0) // title, message, keys
	left := m.stages(height)
	right := m.panel(m.panelWidth(), height)
	bar := m.theme.Paint(theme.Wire, m.theme.Pick("│", "|"))
	for i := range height {
		rows = append(rows, m.theme.Fit(at(left, i), m.stagesWidth())+bar+" "+at(right, i))
	}
	return append(rows, m.messageLine())
}

func (m Model) rule() string {
	return m.theme.Paint(theme.Wire, strings.Repeat(m.theme.Pick("─", "-"), m.width))
}

func (m Model) drawing() []string {
	height := 7
	if m.width >= oneline.RoomyWidth && m.height >= 36 {
		height = oneline.RoomyHeight + 1
	}
	return strings.Split(oneline.View(m.plan, m.snapshot.Live, m.unproved(), m.snapshot.Now, m.maxAge(), m.theme, m.width, height), "\n")
}

func (m Model) unproved() map[signal.Name]bool {
	unproved := map[signal.Name]bool{}
	for name := range m.snapshot.Live {
		unproved[name] = !name.IsState() && !m.snapshot.State.IsProved(name)
	}
	return unproved
}

func (m Model) stagesWidth() int {
	switch {
	case m.width >= wide:
		return stagesWide
	case m.width >= middle:
		return stagesMiddle
	}
	return stagesNarrow
}

func (m Model) panelWidth() int { return m.width - m.stagesWidth() - 2 }

// stages lists the twelve stages and, under the open one, its points as far as there is room.
func (m Model) stages(height int) []string {
	open := m.current().Stage
	points := m.snapshot.State.InStage(open)
	room := height - walk.Stages
	first, last := window(len(points), m.indexIn(points), max(room, 0))
	var rows []string
	for stage := 1; stage <= walk.Stages; stage++ {
		rows = append(rows, m.stageRow(stage, stage == open))
		if stage == open {
			for _, p := range points[first:last] {
				rows = append(rows, m.pointRow(p))
			}
		}
	}
	if len(rows) <= height {
		return rows
	}
	from, to := window(len(rows), open-1, height)
	return rows[from:to]
}

func (m Model) indexIn(points []walk.Point) int {
	for i, p := range points {
		if p.ID == m.point {
			return i
		}
	}
	return 0
}

// window is the part of n rows, size long, that holds row at.
func window(n, at, size int) (from, to int) {
	size = min(size, n)
	from = min(max(at-size/2, 0), n-size)
	return from, from + size
}

var shortTitles = [walk.Stages]string{"Permission", "Papers", "Dead checks", "Link", "Pre-charge", "Window", "First boost",
	"Droop", "Current mode", "Trips", "Shut-down", "Sign-off"}

func (m Model) stageRow(stage int, open bool) string {
	done, all := m.snapshot.State.Progress(stage)
	title := shortTitles[stage-1]
	if m.stagesWidth() == stagesWide {
		title = walk.StageTitles[stage-1]
	}
	lead := " "
	if open {
		lead = m.theme.Pick("▸", ">")
	}
	count := fmt.Sprintf("%d/%d", done, all)
	sign := " "
	if done == all {
		sign = m.theme.Pick("✓", "+")
	}
	row := fmt.Sprintf("%s%2d %s", lead, stage, title)
	row = m.theme.Fit(row, m.stagesWidth()-len(count)-2) + sign + count
	switch {
	case open:
		return m.theme.Paint(theme.Title, row)
	case done == all:
		return m.theme.Paint(theme.Normal, row)
	}
	return row
}

func (m Model) pointRow(p walk.Point) string {
	name := p.ID
	if m.stagesWidth() == stagesWide {
		name = theme.Clean(p.Title)
	}
	row := "    " + m.pointSign(p) + " " + name
	row = m.theme.Fit(row, m.stagesWidth()-1)
	if p.ID == m.point {
		return m.theme.Paint(theme.Selected, row)
	}
	return row
}

func (m Model) pointSign(p walk.Point) string {
	st := m.snapshot.State.Status(p.ID)
	switch {
	case st.Result == walk.Passed && m.snapshot.State.IsDone(p):
		return m.theme.Pick("✓", "+")
	case st.Result == walk.Failed:
		return m.theme.Pick("✗", "X")
	case st.Result == walk.NotApplicable && m.snapshot.State.IsDone(p):
		return m.theme.Pick("∅", "0")
	case st.Result != walk.Open:
		return m.theme.Pick("✎", "s") // waits for its signature
	}
	return m.theme.Pick("·", ".")
}

// messageLine is what was recorded or refused last; an alarm stands before all.
func (m Model) messageLine() string {
	if m.snapshot.Failure != nil {
		return m.theme.Paint(theme.Alarm, " NOTHING IS RECORDED, g goes on elsewhere: "+theme.Clean(strings.TrimPrefix(m.snapshot.Failure.Error(), "the log takes nothing more: "))+" ")
	}
	if c := m.snapshot.Capture; c != nil && c.OpenNow != "" {
		return m.theme.Paint(theme.Alarm, " OPEN THE PRE-CHARGE NOW: "+theme.Clean(c.OpenNow)+" ")
	}
	if m.message == "" {
		return m.rule()
	}
	role, sign := theme.Normal, m.theme.Pick("✓ ", "+ ")
	if m.refused {
		role, sign = theme.Abnormal, m.theme.Pick("✗ ", "X ")
	}
	return " " + m.theme.Paint(role, sign+m.theme.Plain(theme.Clean(m.message)))
}

// keyLine is the keys that work here: what Enter does first, and at the right what works everywhere.
func (m Model) keyLine() string {
	switch {
	case m.prompt != nil:
		return m.promptKeys()
	case m.done != nil:
		return m.hints("Esc", "leave")
	case m.explain:
		return m.hints("any key", "back")
	}
	k := m.keys
	always := m.hinted(k.Far, k.Explain, k.Back)
	line := m.hints("Enter", m.theme.Plain(m.next(m.current()).label))
	var here []key.Binding
	if m.snapshot.Capture != nil {
		here = append(here, k.Stop)
	}
	if act, _ := m.nextAct(); act != "" {
		here = append(here, k.Operate)
	}
	if m.session.Operator != nil && m.snapshot.Capture == nil &&
		m.snapshot.State.CoolsFor(m.snapshot.Now) > 0 && m.current().Stage == 5 {
		here = append(here, k.Hasten)
	}
	if _, ok := m.chartAt(m.current()); ok {
		here = append(here, k.NextPane)
	}
	more := []key.Binding{k.Typed, k.Note, k.Punch, k.Findings, k.Link, k.Change}
	if len(m.current().Hand) == 0 {
		more = more[1:]
	}
	room := m.width - theme.Width(always)
	line = m.theme.Clip(line, room)
	for _, b := range append(here, more...) {
		if hint := m.hinted(b); theme.Width(line)+theme.Width(hint) <= room {
			line += hint
		}
	}
	return m.theme.Fit(line, room) + always
}

func (m Model) promptKeys() string {
	p := m.prompt
	pairs := []string{"Enter", "on"}
	if len(p.form.Fields()) > 1 {
		pairs = append(pairs, m.theme.Pick("↑ ↓", "Up Down"), "field")
	}
	if f, ok := p.form.Field(p.form.Focused()); ok && f.IsChoice() {
		pairs = append(pairs, m.theme.Pick("← →", "Left Right"), "choose")
	}
	if len(p.phrases) > 0 {
		pairs = append(pairs, "Ctrl+N", "text")
	}
	if p.canFill() {
		pairs = append(pairs, "Ctrl+T", "fill in")
	}
	return m.hints(append(pairs, "Esc", "nothing entered")...)
}

// hinted writes key bindings as hints.
func (m Model) hinted(keys ...key.Binding) string {
	var pairs []string
	for _, k := range keys {
		pairs = append(pairs, k.Help().Key, k.Help().Desc)
	}
	return m.hints(pairs...)
}

// hints writes pairs of key and what it does.
func (m Model) hints(pairs ...string) string {
	var b strings.Builder
	for i := 0; i+1 < len(pairs); i += 2 {
		b.WriteString(" " + m.theme.Paint(theme.Key, pairs[i]) + " " + m.theme.Paint(theme.Faint, pairs[i+1]) + " ")
	}
	return b.String()
}

func (m Model) explanation() []string {
	const purpose = "Enter does the next thing at the open point; what that is stands at the foot. A reading that is too old loses its " +
		"number; one with a question mark has not been compared with a known value yet. Nothing is lost by Esc, a resize or a power cut."
	page := form.HelpPage(m.theme, m.width-2, m.height-2, "The walk, from the permit to the signature", purpose, m.keys.groups(m.session.Operator != nil))
	rows := strings.Split(page, "\n")
	for i := range rows {
		rows[i] = " " + rows[i]
	}
	return rows
}

func (m Model) ending() []string {
	rows := []string{m.rule(), "", "  " + m.theme.Paint(theme.Title, "The log is sealed.") + "  Verdict: " + m.theme.Verdict(m.snapshot.State.Verdict()), ""}
	for _, l := range m.done {
		label, text, ok := strings.Cut(theme.Clean(l), "  ")
		if !ok {
			label, text = "", label
		}
		if theme.Width(text) > m.width-14 { // a path must not be broken: it is copied
			rows = append(rows, "  "+m.theme.Paint(theme.Faint, label), "  "+text)
			continue
		}
		for i, part := range wrap(text, m.width-14) {
			rows = append(rows, "  "+m.theme.Paint(theme.Faint, m.theme.Fit(map[bool]string{true: label}[i == 0], 11))+part)
		}
	}
	rows = append(rows, "")
	const onward = "Nothing can be added to it any more. `chargehand verify` on the log shows that it is unchanged, and so does stock " +
		"ssh-keygen; `chargehand sign` countersigns it; `chargehand report` writes its report again."
	for _, l := range wrap(onward, m.width-4) {
		rows = append(rows, "  "+m.theme.Paint(theme.Faint, l))
	}
	return rows
}

func at(rows []string, i int) string {
	if i < len(rows) {
		return rows[i]
	}
	return ""
}

func cut(rows []string, height int) []string { return rows[:min(len(rows), max(height, 0))] }

// wrap breaks a text at spaces so that no line is wider than width; a word that is wider is broken anywhere.
func wrap(text string, width int) []string {
	if width < 2 { // a character may take two columns
		return nil
	}
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		for theme.Width(word) > width {
			if line != "" {
				lines, line = append(lines, line), ""
			}
			head := ansi.Truncate(word, width, "")
			lines, word = append(lines, head), word[len(head):]
		}
		switch {
		case line == "":
			line = word
		case theme.Width(line)+1+theme.Width(word) <= width:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

//go:build peer

package report

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/signing"
	"chargehand/commission/site"
)

// These tests hold the PDF against programs that read it for a living: qpdf 11 and poppler's pdftotext and pdftoppm.

func run(t *testing.T, name string, args ...string) string {
	t.Helper()
	out, err := exec.Command(name, args...).CombinedOutput()
	if err != nil {
		t.Fatalf("%s %v: %v\n%s", name, args, err, out)
	}
	return string(out)
}

func printed(t *testing.T, write func(*bytes.Buffer) error) string {
	t.Helper()
	var b bytes.Buffer
	if err := write(&b); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "printed.pdf")
	if err := os.WriteFile(path, b.Bytes(), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

func reports(t *testing.T) map[string]string {
	s := story(t)
	all := map[string]string{}
	for _, paper := range []Paper{A4, Letter} {
		all["report on "+string(paper)] = printed(t, func(b *bytes.Buffer) error { return s.WritePDF(b, paper) })
		all["sheet on "+string(paper)] = printed(t, func(b *bytes.Buffer) error { return blankSheet(t).WritePDF(b, paper) })
	}
	return all
}

func blankSheet(t *testing.T) Sheet {
	t.Helper()
	text, _ := site.Example()
	s, _, err := site.Read("example.site.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return Sheet{Site: s, File: "example.site.toml", Text: text, Findings: desk.Check(s, nil).Findings, At: time.Date(2026, 12, 1, 9, 30, 0, 0, time.UTC)}
}

func TestPeerQpdf(t *testing.T) {
	for name, path := range reports(t) {
		if out := run(t, "qpdf", "--check", path); !strings.Contains(out, "No syntax or stream encoding errors") {
			t.Errorf("qpdf --check of the %s: %s", name, out)
		}
	}
}

// TestPeerText finds every finding's id and value, the marks, the log's id and hash and the number of every page.
func TestPeerText(t *testing.T) {
	s := story(t)
	path := printed(t, func(b *bytes.Buffer) error { return s.WritePDF(b, A4) })
	flat := strings.Join(strings.Fields(run(t, "pdftotext", "-layout", path, "-")), " ")
	for _, all := range [][]Finding{s.Desk, s.Measured} {
		for _, f := range all {
			n := figuresOf(f.Finding)
			for _, want := range []string{f.Finding.ID, n.value, n.limit, string(f.Finding.Verdict)} {
				if !strings.Contains(flat, want) {
					t.Errorf("pdftotext does not find %q of %s", want, named(f.Finding))
				}
			}
		}
	}
	pages := strings.Split(strings.TrimSuffix(run(t, "pdftotext", "-layout", path, "-"), "\f"), "\f")
	for i, page := range pages {
		for _, want := range []string{"REHEARSAL", s.Log.ID, s.Log.Head, fmt.Sprintf("page %d of %d", i+1, len(pages))} {
			if !strings.Contains(page, want) {
				t.Errorf("page %d lacks %q", i+1, want)
			}
		}
	}
	for _, want := range []string{"Ω", "µs", "τ", "°C", "±", "≤", "²", "SHA256:"} {
		if !strings.Contains(flat, want) {
			t.Errorf("pdftotext does not find the symbol %q", want)
		}
	}
}

// TestPeerProof types the commands that the report prints for a Unix shell, with the list of signers that its text asks for.
func TestPeerProof(t *testing.T) {
	s := story(t)
	folder := t.TempDir()
	for _, name := range []string{"rehearsal.chlog", "rehearsal.chlog.sig"} {
		text, err := os.ReadFile(filepath.Join("testdata", name))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(folder, name), text, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	armoured, err := os.ReadFile(filepath.Join(folder, "rehearsal.chlog.sig"))
	if err != nil {
		t.Fatal(err)
	}
	signature, err := signing.Parse(armoured)
	if err != nil {
		t.Fatal(err)
	}
	list := "NAME namespaces=\"chargehand\" " + signature.Key().AuthorizedKey() + "\n"
	if err := os.WriteFile(filepath.Join(folder, "allowed_signers"), []byte(list), 0o644); err != nil {
		t.Fatal(err)
	}
	var printed []string
	for _, step := range s.proofSteps() {
		for _, c := range step.commands {
			if c.where != shell {
				continue
			}
			printed = append(printed, run(t, "sh", "-c", "cd "+folder+" && "+c.text))
		}
	}
	want := []string{s.Log.SHA256, s.Log.Head, "Good \"chargehand\" signature for NAME with ED25519 key " + s.Verification.Signatures[0].Key}
	if len(printed) != len(want) {
		t.Fatalf("the report prints %d commands, want %d", len(printed), len(want))
	}
	for i := range want {
		if !strings.HasPrefix(printed[i], want[i]) {
			t.Errorf("command %d prints %q, want %q", i+1, printed[i], want[i])
		}
	}
}

// TestPeerSheet finds every point of the walk and every finding that does not pass.
func TestPeerSheet(t *testing.T) {
	b := blankSheet(t)
	flat := strings.Join(strings.Fields(run(t, "pdftotext", "-layout", printed(t, func(to *bytes.Buffer) error { return b.WritePDF(to, A4) }), "-")), " ")
	for _, want := range []string{"safe.permit", "charge.rise", "leave.handover", "Predicted pre-charge", "Predicted droop", "Predicted discharge", "Punch list", "signature in ink"} {
		if !strings.Contains(flat, want) {
			t.Errorf("the sheet lacks %q", want)
		}
	}
	for _, f := range b.Findings {
		if f.Verdict != finding.Pass && f.Verdict != finding.Info && !strings.Contains(flat, f.ID) {
			t.Errorf("the sheet lacks %s, which is %s", f.ID, f.Verdict)
		}
	}
}

// TestPeerPictures renders every page: none may be blank, and none may draw into the outermost 4 mm.
func TestPeerPictures(t *testing.T) {
	for name, path := range reports(t) {
		run(t, "pdftoppm", "-gray", "-r", "30", path, path)
		pictures, err := filepath.Glob(path + "-*.pgm")
		if err != nil || len(pictures) < 10 {
			t.Fatalf("%s: %d pages, %v, want at least 10", name, len(pictures), err)
		}
		for _, picture := range pictures {
			inked, edge := dark(t, picture)
			if inked < 0.004 {
				t.Errorf("%s, %s: %.2f %% of the page is inked, want it not blank", name, filepath.Base(picture), 100*inked)
			}
			if edge > 0 {
				t.Errorf("%s, %s: %d dots in the outermost 4 mm", name, filepath.Base(picture), edge)
			}
		}
	}
}

// dark gives the part of a picture that is darker than light grey, and how many such dots lie within 4 mm of an edge.
func dark(t *testing.T, path string) (part float64, edge int) {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var w, h, most int
	if _, err := fmt.Sscanf(string(text[:40]), "P5\n%d %d\n%d\n", &w, &h, &most); err != nil || len(text) < w*h {
		t.Fatalf("%s is no picture: %v", path, err)
	}
	dots := text[len(text)-w*h:]
	count, rim := 0, 5 // 4 mm at 30 dots an inch
	for i, dot := range dots {
		if int(dot) > 200*most/255 {
			continue
		}
		count++
		if x, y := i%w, i/w; x < rim || y < rim || x >= w-rim || y >= h-rim {
			edge++
		}
	}
	return float64(count) / float64(w*h), edge
}

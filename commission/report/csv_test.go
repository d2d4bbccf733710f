package report

import (
	"bytes"
	"encoding/csv"
	"os"
	"strconv"
	"strings"
	"testing"

	"chargehand/commission/chlog"
)

// The characters that start a formula are those of the OWASP page on CSV injection; RFC 4180 has no word on it.
func TestWordsAreNoFormulas(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"=1+1", "'=1+1"}, {"+1+1", "'+1+1"}, {"-1+1", "'-1+1"}, {"@SUM(A1)", "'@SUM(A1)"}, {"\t=1", "'\t=1"}, {"\r=1", "'\r=1"}, {"＝1", "'＝1"},
		{"-1.5", "-1.5"}, {"+2e-3", "+2e-3"}, {"-", "'-"}, {"-1.", "'-1."}, {"−5", "−5"}, {"plain", "plain"}, {"", ""}, {"'=1", "'=1"}, {"a=1", "a=1"},
	} {
		if got := words(c.in); got != c.want {
			t.Errorf("words(%q) = %q, want %q", c.in, got, c.want)
		}
	}
}

func story(t *testing.T) Story {
	t.Helper()
	const path = "testdata/rehearsal.chlog"
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	s, err := Read(f, chlog.Verifier{}.File(path))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// TestTablesAreCSV reads every table back: the same number of fields in each row, CR LF at each end.
func TestTablesAreCSV(t *testing.T) {
	s := story(t)
	for _, table := range s.Tables() {
		var b bytes.Buffer
		if err := table.Write(&b); err != nil {
			t.Fatal(err)
		}
		rows, err := csv.NewReader(bytes.NewReader(b.Bytes())).ReadAll()
		if err != nil {
			t.Errorf("%s: %v", table.Name, err)
			continue
		}
		if n := strings.Count(b.String(), "\r\n"); n < len(rows) || strings.Count(b.String(), "\n") != n {
			t.Errorf("%s: %d rows end with %d CR LF and %d LF, want CR LF at each", table.Name, len(rows), n, strings.Count(b.String(), "\n"))
		}
		for i, row := range rows[1:] {
			if row[0] != s.Log.ID {
				t.Errorf("%s, row %d begins with %q, want the log's id", table.Name, i+1, row[0])
			}
		}
	}
}

// TestCaptureTableHoldsEverySample compares the table with the capture, bit for bit.
func TestCaptureTableHoldsEverySample(t *testing.T) {
	s := story(t)
	for i, c := range s.Captures {
		var b bytes.Buffer
		if err := s.Tables()[4+i].Write(&b); err != nil {
			t.Fatal(err)
		}
		rows, err := csv.NewReader(&b).ReadAll()
		if err != nil || len(rows) != c.Samples+1 {
			t.Fatalf("capture %s: %d rows, %v, want %d", c.ID, len(rows), err, c.Samples+1)
		}
		for k, sample := range c.data.Samples {
			for j, v := range sample.Values {
				field := rows[k+1][4+j]
				got, err := strconv.ParseFloat(field, 64)
				if v.OK && (err != nil || got != v.V) || !v.OK && field != "" {
					t.Fatalf("capture %s, sample %d, %s = %q, want %v", c.ID, k, c.data.Channels[j].Name, field, v)
				}
			}
		}
	}
}

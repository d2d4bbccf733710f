package finding

import (
	"encoding/csv"
	"io"
	"math"
	"strconv"
	"strings"
)

// csvHeader names the columns of [Sheet.WriteCSV]. A row with a part is a further result of the finding above it.
var csvHeader = []string{"site", "reference", "file", "id", "subject", "part", "title", "unit", "state", "low", "nominal", "high",
	"limit_low", "limit_high", "margin", "verdict", "because", "basis", "remedy"}

// WriteCSV writes the sheet as CSV after RFC 4180: lines end with CR LF, fields with commas, quotes or line ends are quoted.
// Numbers are in coherent SI units with a decimal point and are empty where not finite. The header is written once, by
// whoever writes several sheets, through header.
func (s Sheet) WriteCSV(to io.Writer, header bool) error {
	w := csv.NewWriter(to)
	w.UseCRLF = true
	if header {
		if err := w.Write(csvHeader); err != nil {
			return err
		}
	}
	for _, f := range s.Findings {
		if err := s.writeRows(w, f); err != nil {
			return err
		}
	}
	w.Flush()
	return w.Error()
}

func (s Sheet) writeRows(w *csv.Writer, f Finding) error {
	margin := f.Margin
	if !f.Limit.IsGiven() {
		margin = math.NaN()
	}
	row := []string{s.Site, s.Reference, s.File, f.ID, f.Subject, "", f.Title, f.Unit, string(f.State)}
	row = append(row, f.Value.fields()...)
	row = append(row, edge(f.Limit.Low), edge(f.Limit.High), plainNumber(margin), string(f.Verdict), strings.Join(f.Because, "; "), f.Basis, f.Remedy)
	if err := w.Write(row); err != nil {
		return err
	}
	for _, p := range f.Parts {
		row := []string{s.Site, s.Reference, s.File, f.ID, f.Subject, p.Name, f.Title, p.Unit, ""}
		row = append(row, p.Value.fields()...)
		if err := w.Write(append(row, "", "", "", "", "", "", "")); err != nil {
			return err
		}
	}
	return nil
}

func (v Value) fields() []string {
	return []string{plainNumber(v.Low), plainNumber(v.Nominal), plainNumber(v.High)}
}

func edge(p *float64) string {
	if p == nil {
		return ""
	}
	return plainNumber(*p)
}

func plainNumber(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

package window

import (
	"fmt"
	"io"
	"math"
	"text/tabwriter"

	"chargehand/commission/quantity"
)

// WriteRows writes the window over the state of charge as a table of text: nominal values, and for the margin its least
// over all corners. It takes 76 columns at most; a figure that is not known is "–".
func WriteRows(to io.Writer, rows []Row) error {
	w := tabwriter.NewWriter(to, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "charge\trest\tterminal\tcurrent\tavailable\tcharging\tmargin\tat least\t")
	for _, r := range rows {
		fmt.Fprintf(w, "%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t\n", figure(r.StateOfCharge, "%"), figure(r.Rest, "V"), figure(r.Terminal.Nominal, "V"),
			figure(r.Current.Nominal, "A"), figure(r.Available.Nominal, "W"), figure(r.Charging.Nominal, "W"), figure(r.Margin.Nominal, "V"), figure(r.Margin.Low, "V"))
	}
	return w.Flush()
}

func figure[Q quantity.Scalar](v Q, unit string) string {
	if math.IsNaN(float64(v)) {
		return "–"
	}
	return quantity.Engineering(float64(v), unit, 3)
}

package main

import (
	"fmt"
	"io"
	"math"

	"chargehand/commission/quantity"
	"chargehand/commission/site"
	"chargehand/commission/window"
)

// writeWindow writes the window over the state of charge as a table.
func writeWindow(w io.Writer, s site.Site) error {
	rows := window.Table(s)
	if len(rows) == 0 {
		_, err := fmt.Fprintln(w, "the window needs the source's highest and lowest rest voltage")
		return err
	}
	fmt.Fprintf(w, "%8s %10s %22s %22s %12s %12s %12s\n", "charge", "rest", "terminal, discharging", "current", "available", "charging", "margin")
	for _, r := range rows {
		charge := "-"
		if !math.IsNaN(float64(r.StateOfCharge)) {
			charge = fmt.Sprintf("%.0f %%", 100*float64(r.StateOfCharge))
		}
		_, err := fmt.Fprintf(w, "%8s %10s %22s %22s %12s %12s %12s\n", charge, show(float64(r.Rest), "V"),
			show(float64(r.Terminal.Low), "V")+" … "+show(float64(r.Terminal.High), "V"),
			show(float64(r.Current.Low), "A")+" … "+show(float64(r.Current.High), "A"),
			show(float64(r.Available.Low), "W"), show(float64(r.Charging.Low), "W"), show(float64(r.Margin.Low), "V"))
		if err != nil {
			return err
		}
	}
	return nil
}

func show(v float64, unit string) string { return quantity.Engineering(v, unit, 4) }

package measured_test

import (
	"fmt"
	"math"
	"os"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/measured"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// A charge of the bus voltage alone that takes twice as long as it should: resistance and capacitance cannot be told apart.
func ExamplePrecharge() {
	text, err := os.ReadFile("../../testdata/sites/wagtail.site.toml")
	if err != nil {
		panic(err)
	}
	s, _, err := site.Read("wagtail.site.toml", text)
	if err != nil {
		panic(err)
	}
	c := capture.Capture{Kind: capture.Precharge, Channels: []capture.Channel{{Name: signal.BusVoltage, Unit: "V", Type: "u16", Scale: 0.1}}}
	for at := time.Duration(0); at < 9*time.Second; at += 50 * time.Millisecond {
		v := math.Round(10*780*(1-math.Exp(-at.Seconds()/2.5))) / 10
		c.Samples = append(c.Samples, capture.Sample{At: at, Values: []capture.Value{{V: v, OK: true}}})
	}
	f := measured.Precharge(s, c)[0]
	fmt.Printf("%s %s: %.2f s, predicted %.2f … %.2f s\n", f.ID, f.Verdict, f.Value.Nominal, *f.Limit.Low, *f.Limit.High)
	for _, cause := range f.Cause {
		fmt.Println(cause.ID, cause.Score)
	}
	// Output:
	// measured.precharge fail: 2.50 s, predicted 0.95 … 1.56 s
	// resistor-high 0.8
	// bank-added 0.8
}

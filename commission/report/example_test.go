package report_test

import (
	"fmt"
	"os"

	"chargehand/commission/chlog"
	"chargehand/commission/report"
)

func Example() {
	const log = "testdata/rehearsal.chlog"
	f, err := os.Open(log)
	if err != nil {
		fmt.Println(err)
		return
	}
	defer f.Close()
	story, err := report.Read(f, chlog.Verifier{}.File(log))
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(story.Marks, story.Verdict)
	for _, why := range story.Because[1:] {
		fmt.Println(why)
	}
	// Output:
	// [REHEARSAL] fail
	// discharge.touch-safe is marginal: it takes up to 16.46 min, 5.000 s is wanted without a label
	// down.discharge (Discharge): fail
}

package finding_test

import (
	"fmt"

	"chargehand/commission/finding"
)

// One corner beyond the limit: marginal as a rule, a failure where the finding guards life or equipment.
func ExampleJudge() {
	current := finding.ValueOf(180, 195, 210)
	for _, guards := range []bool{false, true} {
		verdict, margin := finding.Judge(current, finding.AtMost(200), guards, 0)
		fmt.Println(verdict, margin)
	}
	// Output:
	// marginal -10
	// fail -10
}

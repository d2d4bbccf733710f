package site

import (
	"fmt"

	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

// component is the value of a part, above 0, with its tolerance. least and most bound what is common, in SI: outside them
// the unit is probably wrong and the reader warns. The bounds are common practice, wide on purpose.
func component(least, most float64, example string) quantity.Rule {
	return quantity.Rule{Sign: quantity.Positive, Tolerance: true, Least: least, Most: most, Example: example}
}

// parasitic is a component's value that may be neglected as 0.
func parasitic(least, most float64, example string) quantity.Rule {
	return quantity.Rule{Sign: quantity.NotNegative, Tolerance: true, Least: least, Most: most, Example: example}
}

// limit is a rating, a setting or a limit above 0: it stands in full and has no tolerance.
func limit(least, most float64, example string) quantity.Rule {
	return quantity.Rule{Sign: quantity.Positive, Least: least, Most: most, Example: example}
}

// amount is a limit that may be 0.
func amount(least, most float64, example string) quantity.Rule {
	return quantity.Rule{Sign: quantity.NotNegative, Least: least, Most: most, Example: example}
}

// degrees is a temperature, which may be below 0 °C.
func degrees(example string) quantity.Rule {
	return quantity.Rule{Least: 0, Most: 1500, Example: example}
}

// volts is a limit on the low-voltage DC side (IEC 60664-1 ends at 1500 V DC; larger plants exist).
func volts(example string) quantity.Rule { return limit(10, 5000, example) }

// amperes is a current rating.
func amperes(example string) quantity.Rule { return limit(0.1, 1e6, example) }

// notAbove refuses a value greater than the one it must not exceed, where both are given.
func notAbove[Q quantity.Scalar](t *document.Table, key string, v quantity.Entered[Q], upperKey string, upper quantity.Entered[Q]) {
	if v.IsGiven() && upper.IsGiven() && v.Nominal > upper.Nominal {
		t.Refuse(key, fmt.Sprintf("at most the %s of %s", upperKey, upper.Text), fmt.Sprintf("%s = %q", key, upper.Text))
	}
}

// below refuses a value that is not less than another, where both are given.
func below[Q quantity.Scalar](t *document.Table, key string, v quantity.Entered[Q], upperKey string, upper quantity.Entered[Q]) {
	if v.IsGiven() && upper.IsGiven() && v.Nominal >= upper.Nominal {
		t.Refuse(key, fmt.Sprintf("less than the %s of %s", upperKey, upper.Text), "")
	}
}

// ascends refuses a value in a list that is not more than the one before it, where both are given.
func ascends[Q quantity.Scalar](row *document.Table, key string, v, before quantity.Entered[Q]) {
	if v.IsGiven() && before.IsGiven() && v.Nominal <= before.Nominal {
		row.Refuse(key, "more than the "+before.Text+" before it", "")
	}
}

// neverFalls refuses a value in a list that is less than the one before it, where both are given; what is "a voltage".
func neverFalls[Q quantity.Scalar](row *document.Table, key, what string, v, before quantity.Entered[Q]) {
	if v.IsGiven() && before.IsGiven() && v.Nominal < before.Nominal {
		row.Refuse(key, what+" that does not fall below the "+before.Text+" before it", "")
	}
}

// atMostAll refuses a ratio above 100 %.
func atMostAll(t *document.Table, key string, v quantity.Entered[quantity.Ratio]) {
	if v.Nominal > 1 {
		t.Refuse(key, "at most 100 %", key+` = "100 %"`)
	}
}

// unique refuses a name that stood before in the same list.
type unique map[string]bool

func (u unique) check(t *document.Table, key, name, what string) {
	if name != "" && u[name] {
		t.Refuse(key, "a name that no other "+what+" has", "")
	}
	u[name] = true
}

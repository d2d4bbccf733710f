// Package cornertest makes other sites of one site, to try a family of findings on: drawn inside its tolerances, or with
// wider ones.
//
// Start at [Draw] and [Widen]. They find the toleranced values of a site by their shape, so that a key added later is drawn too.
package cornertest

import (
	"math/rand/v2"
	"reflect"

	"chargehand/commission/site"
)

// Draw is the site with every toleranced value somewhere inside its tolerance and exact there; ends is the chance that a
// value stands at one of its ends instead.
func Draw(s site.Site, random *rand.Rand, ends float64) site.Site {
	return changed(s, func(low, nominal, high float64) (float64, float64, float64) {
		v := low + random.Float64()*(high-low)
		if random.Float64() < ends {
			v = low
			if random.IntN(2) == 1 {
				v = high
			}
		}
		return v, v, v
	})
}

// Widen is the site with every tolerance that many times as wide.
func Widen(s site.Site, by float64) site.Site {
	return changed(s, func(low, nominal, high float64) (float64, float64, float64) {
		return nominal - by*(nominal-low), nominal, nominal + by*(high-nominal)
	})
}

// between changes the ends and the nominal value of one tolerance.
type between func(low, nominal, high float64) (float64, float64, float64)

func changed(s site.Site, change between) site.Site {
	change.in(reflect.ValueOf(&s).Elem())
	return s
}

// in changes every spread below v that has a width. What v points to is copied first, so the site handed in is not touched.
func (change between) in(v reflect.Value) {
	switch v.Kind() {
	case reflect.Pointer:
		if !v.IsNil() {
			to := reflect.New(v.Type().Elem())
			to.Elem().Set(v.Elem())
			v.Set(to)
			change.in(to.Elem())
		}
	case reflect.Slice:
		if v.Len() > 0 && v.Type().Elem().Kind() == reflect.Struct {
			to := reflect.MakeSlice(v.Type(), v.Len(), v.Len())
			reflect.Copy(to, v)
			v.Set(to)
			for i := range to.Len() {
				change.in(to.Index(i))
			}
		}
	case reflect.Struct:
		if v.NumField() == 3 && v.Type().Field(0).Name == "Low" && v.Field(0).CanFloat() {
			if low, high := v.Field(0).Float(), v.Field(2).Float(); low != high {
				l, n, h := change(low, v.Field(1).Float(), high)
				v.Field(0).SetFloat(l)
				v.Field(1).SetFloat(n)
				v.Field(2).SetFloat(h)
			}
			return
		}
		for i := range v.NumField() {
			if v.Field(i).CanSet() {
				change.in(v.Field(i))
			}
		}
	}
}

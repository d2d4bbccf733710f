package findingtest

import (
	"fmt"
	"math/rand/v2"
	"reflect"

	"chargehand/commission/site"
)

// Clone is a site that shares nothing with the one handed in.
func Clone(s site.Site) site.Site {
	return clone(reflect.ValueOf(s)).Interface().(site.Site)
}

func clone(v reflect.Value) reflect.Value {
	to := reflect.New(v.Type()).Elem()
	switch v.Kind() {
	case reflect.Pointer:
		if v.IsNil() {
			return to
		}
		to.Set(reflect.New(v.Type().Elem()))
		to.Elem().Set(clone(v.Elem()))
	case reflect.Slice:
		if v.IsNil() {
			return to
		}
		to.Set(reflect.MakeSlice(v.Type(), v.Len(), v.Len()))
		for i := range v.Len() {
			to.Index(i).Set(clone(v.Index(i)))
		}
	case reflect.Struct:
		to.Set(v)
		for i := range v.NumField() {
			if v.Type().Field(i).IsExported() {
				to.Field(i).Set(clone(v.Field(i)))
			}
		}
	default:
		to.Set(v)
	}
	return to
}

// Tolerance is one toleranced value of a site, in place.
type Tolerance struct {
	Name                string
	low, nominal, high  reflect.Value
	Low, Nominal, Upper float64 // as they were found
}

// Set makes the value exact.
func (t Tolerance) Set(v float64) {
	t.low.SetFloat(v)
	t.nominal.SetFloat(v)
	t.high.SetFloat(v)
}

// Widen makes the tolerance wider by a factor about its nominal.
func (t Tolerance) Widen(factor float64) {
	t.low.SetFloat(t.Nominal - factor*(t.Nominal-t.Low))
	t.high.SetFloat(t.Nominal + factor*(t.Upper-t.Nominal))
}

// Draw is the site with every toleranced value somewhere inside its tolerance and exact there; ends is the chance that a
// value stands at one of its ends instead.
func Draw(s site.Site, random *rand.Rand, ends float64) site.Site {
	drawn := Clone(s)
	for _, t := range Tolerances(&drawn) {
		t.Set(t.drawn(random, ends))
	}
	return drawn
}

func (t Tolerance) drawn(random *rand.Rand, ends float64) float64 {
	switch {
	case random.Float64() >= ends:
		return t.Low + random.Float64()*(t.Upper-t.Low)
	case random.IntN(2) == 1:
		return t.Upper
	}
	return t.Low
}

// Tolerances are the toleranced values of a site, named after its fields.
func Tolerances(s *site.Site) []Tolerance {
	var found []Tolerance
	collect(reflect.ValueOf(s).Elem(), "", &found)
	return found
}

func collect(v reflect.Value, name string, found *[]Tolerance) {
	switch v.Kind() {
	case reflect.Pointer:
		if !v.IsNil() {
			collect(v.Elem(), name, found)
		}
	case reflect.Slice:
		for i := range v.Len() {
			collect(v.Index(i), fmt.Sprintf("%s[%d]", name, i), found)
		}
	case reflect.Struct:
		low, nominal, high := v.FieldByName("Low"), v.FieldByName("Nominal"), v.FieldByName("High")
		if low.IsValid() && nominal.IsValid() && high.IsValid() && low.Kind() == reflect.Float64 {
			if low.Float() < high.Float() {
				*found = append(*found, Tolerance{name, low, nominal, high, low.Float(), nominal.Float(), high.Float()})
			}
			return
		}
		for i := range v.NumField() {
			if f := v.Type().Field(i); f.IsExported() {
				collect(v.Field(i), name+"."+f.Name, found)
			}
		}
	}
}

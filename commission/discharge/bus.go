package discharge

import (
	"math"

	"chargehand/commission/quantity"
)

// Bus is a bus that discharges, with one value for each of its quantities: one corner of a site.
type Bus struct {
	Link      quantity.Capacitance // C_link, all banks
	Filter    quantity.Capacitance // C_f at the star point; 0 where there is none
	Held      quantity.Voltage     // E, where the filter stands until it joins
	Bleeder   quantity.Resistance  // R_b, all in parallel; 0 where there is none
	Auxiliary quantity.Power       // P; 0 where there is none
	StopsAt   quantity.Voltage     // where the auxiliary supply lets go
}

// Stored is the energy at link voltage v: ½·C_link·v² + ½·C_f·E².
func (b Bus) Stored(v quantity.Voltage) quantity.Energy {
	return quantity.Energy((float64(b.Link)*float64(v*v) + float64(b.Filter)*float64(b.Held*b.Held)) / 2)
}

// TimeConstant is R_b·(C_link + C_f), how the tail falls; infinite without a bleeder.
func (b Bus) TimeConstant() quantity.Seconds {
	if b.Bleeder == 0 {
		return quantity.Seconds(math.Inf(1))
	}
	return quantity.Seconds(float64(b.Bleeder) * float64(b.Link+b.Filter))
}

// stretch is a part of the fall in which nothing joins and nothing lets go.
type stretch struct{ from, to, c, p float64 }

// stretches cut the fall from one voltage to another where the filter joins and where the auxiliary supply lets go.
func (b Bus) stretches(from, to float64) []stretch {
	list := make([]stretch, 0, 3)
	for from > to {
		s := stretch{from: from, to: to, c: float64(b.Link)}
		if held := float64(b.Held); b.Filter > 0 && from > held {
			s.to = math.Max(s.to, held)
		} else {
			s.c += float64(b.Filter)
		}
		if stops := float64(b.StopsAt); b.Auxiliary > 0 && from > stops {
			s.to, s.p = math.Max(s.to, stops), float64(b.Auxiliary)
		}
		list, from = append(list, s), s.to
	}
	return list
}

// Time is how long the link takes from one voltage to another; infinite where it has no path that far, 0 where it is there.
func (b Bus) Time(from, to quantity.Voltage) quantity.Seconds {
	sum := 0.0
	for _, s := range b.stretches(float64(from), float64(to)) {
		sum += b.time(s)
	}
	return quantity.Seconds(sum)
}

func (b Bus) time(s stretch) float64 {
	r := float64(b.Bleeder)
	switch {
	case r == 0 && s.p == 0:
		return math.Inf(1)
	case r == 0:
		return s.c * (s.from*s.from - s.to*s.to) / (2 * s.p)
	}
	return r * s.c / 2 * math.Log((s.from*s.from+s.p*r)/(s.to*s.to+s.p*r))
}

// VoltageAt is the link voltage t after it stood at from.
func (b Bus) VoltageAt(from quantity.Voltage, t quantity.Seconds) quantity.Voltage {
	left, v := float64(t), float64(from)
	r := float64(b.Bleeder)
	for _, s := range b.stretches(float64(from), 0) {
		if d := b.time(s); left >= d {
			left, v = left-d, s.to
			continue
		}
		switch {
		case r == 0 && s.p == 0:
			return quantity.Voltage(s.from)
		case r == 0:
			return quantity.Voltage(math.Sqrt(math.Max(0, s.from*s.from-2*s.p*left/s.c)))
		}
		square := (s.from*s.from+s.p*r)*math.Exp(-2*left/(r*s.c)) - s.p*r
		return quantity.Voltage(math.Sqrt(math.Max(0, square)))
	}
	return quantity.Voltage(v)
}

package simulator

import (
	"cmp"
	"errors"
	"math"
	"slices"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/circuit"
	"chargehand/protocol/registermap"
)

// defaultUnit is the unit identifier where the site gives none.
const defaultUnit = 1

// place is one register or bit of one unit.
type place struct {
	unit    uint8
	table   registermap.Table
	address registermap.Address
}

// image is the registers of one device as its last refresh left them.
type image struct {
	infeed int // the other infeed whose device this is, -1 for the converter
	unit   uint8
	units  map[uint8]bool // every unit identifier that it answers to
	points []registermap.Point
	words  map[place]uint16 // bits are 0 or 1; every readable place is a key
	before map[place]uint16 // as the refresh before left them
	due    time.Duration
	beats  uint64
}

func newImages(o Options) ([]*image, error) {
	unit := uint8(defaultUnit)
	if o.Site.Device != nil {
		unit = o.Site.Device.UnitID
	}
	if len(o.Map.Points) == 0 {
		return nil, errors.New("register map without a signal")
	}
	list := []*image{newImage(-1, unit, o.Map)}
	for _, p := range o.Peers {
		for k := 1; k < len(o.Site.Infeeds); k++ {
			if o.Site.Infeeds[k].Name == p.Infeed {
				list = append(list, newImage(k-1, p.UnitID, p.Map))
			}
		}
	}
	return list, nil
}

func newImage(infeed int, unit uint8, m registermap.Map) *image {
	i := &image{infeed: infeed, unit: unit, points: m.Points, words: map[place]uint16{},
		units: map[uint8]bool{unit: true}}
	type span struct{ from, to int }
	spans := map[place][]span{} // by unit and table, address 0
	for _, p := range m.Points {
		at := i.at(p)
		key := place{at.unit, at.table, 0}
		i.units[at.unit] = true
		spans[key] = append(spans[key], span{int(p.Address), int(p.Address) + p.Type.Words()})
	}
	for key, list := range spans {
		slices.SortFunc(list, func(a, b span) int { return cmp.Compare(a.from, b.from) })
		end := list[0].from
		for _, s := range list {
			from := s.from
			if s.from-end <= m.MaxGap {
				from = min(end, s.from) // registers in between are reserved and read 0
			}
			for a := from; a < s.to; a++ {
				i.words[place{key.unit, key.table, registermap.Address(a)}] = 0
			}
			end = max(end, s.to)
		}
	}
	i.before = i.words
	return i
}

// at is the first place of a point.
func (i *image) at(p registermap.Point) place {
	unit := i.unit
	if p.HasUnitID {
		unit = p.UnitID
	}
	return place{unit, p.Table, p.Address}
}

// refresh renews every image that is due. The caller holds the lock.
func (s *Simulator) refresh() {
	for _, i := range s.images {
		if s.elapsed < i.due {
			continue
		}
		period := s.options.Refresh
		if slow := s.truth.readings.slow; slow > 0 {
			period = slow
		}
		i.due += time.Duration(float64(period) * (0.9 + 0.2*s.noise.Float64()))
		if i.due <= s.elapsed {
			i.due = s.elapsed + period
		}
		s.fill(i)
	}
}

// fill takes the values of now into an image.
func (s *Simulator) fill(i *image) {
	i.beats++
	r := s.plant.Read()
	faults := &s.truth.readings
	next := make(map[place]uint16, len(i.words))
	for k := range i.words {
		next[k] = 0
	}
	for _, p := range i.points {
		value, known := s.value(i, p.Name, r)
		first := i.at(p)
		var words []uint16
		switch {
		case p.Type == registermap.Bit:
			s.fillBit(next, first, p, value != 0)
			continue
		case !known:
			words = missingCode(p)
		default:
			words = faults.spoil(p, value, encode(p, faults.scaled(p.Name, value)))
		}
		if faults.frozen(s, p.Name) {
			for k := range words {
				at := place{first.unit, first.table, first.address + registermap.Address(k)}
				next[at] = i.words[at]
			}
			continue
		}
		for k, w := range words {
			next[place{first.unit, first.table, first.address + registermap.Address(k)}] = w
		}
	}
	i.before, i.words = i.words, next
}

func (s *Simulator) fillBit(next map[place]uint16, at place, p registermap.Point, on bool) {
	if p.SignReversed {
		on = !on
	}
	bit := uint16(0)
	if on {
		bit = 1
	}
	if !p.Table.HasBits() {
		if bit <<= p.BitNumber; p.ByteOrder == registermap.LowFirst {
			bit = bit>>8 | bit<<8
		}
	}
	next[at] |= bit
}

// missingCode is the map's code for 'no value', or all bits set.
func missingCode(p registermap.Point) []uint16 {
	if len(p.Missing) > 0 {
		return p.Missing[0]
	}
	words := make([]uint16, p.Type.Words())
	for k := range words {
		words[k] = 0xFFFF
	}
	return words
}

// value is what the device says of a signal, with its sensor's error; known is false where it has none.
func (s *Simulator) value(i *image, n signal.Name, r circuit.Reading) (v float64, known bool) {
	if i.infeed >= 0 {
		v, known = s.peerValue(i.infeed, n, r)
	} else {
		v, known = s.ownValue(n, r)
	}
	if n == signal.Heartbeat {
		return float64(i.beats % 30000), true
	}
	if e, has := s.truth.sensors[n]; has && known {
		v = v*e.gain + e.offset + e.noise*s.noise.NormFloat64()
	}
	return v, known
}

func state(on bool) float64 {
	if on {
		return 1
	}
	return 0
}

// ownValue is a signal of the converter, without its sensor's error.
func (s *Simulator) ownValue(n signal.Name, r circuit.Reading) (float64, bool) {
	d, t := &s.device, &s.truth
	phase := func(k int) (float64, bool) {
		if k >= len(r.PhaseCurrents) {
			return 0, false
		}
		return r.PhaseCurrents[k], true
	}
	switch n {
	case signal.BusVoltage:
		return r.BusVoltage + t.cable*r.BusCurrent, true
	case signal.SourceVoltage:
		return r.SourceVoltage, true
	case signal.StarPointVoltage:
		return r.StarVoltage, true
	case signal.SourceCurrent:
		return r.SourceCurrent, true
	case signal.BusCurrent:
		return r.BusCurrent, true
	case signal.PhaseCurrent1:
		return phase(0)
	case signal.PhaseCurrent2:
		return phase(1)
	case signal.PhaseCurrent3:
		return phase(2)
	case signal.Power:
		v, i := t.sensors[signal.BusVoltage], t.sensors[signal.BusCurrent]
		return (r.BusVoltage*v.gain + v.offset) * (r.BusCurrent*i.gain + i.offset), true
	case signal.ResistorTemperature:
		return t.plant.Precharge.Ambient + r.ResistorRise, true
	case signal.HeatsinkTemperature:
		return d.heatsink, true
	case signal.InsulationResistance:
		return d.insulation(t), true
	case signal.Ready:
		return state(d.ready(r)), true
	case signal.Running:
		return state(r.Released), true
	case signal.PrechargeClosed:
		return state(r.PrechargeReported), true
	case signal.BypassClosed:
		return state(r.BypassReported), true
	case signal.MainClosed:
		return state(r.IsolatorClosed), true
	case signal.ChopperActive:
		return state(r.ChopperOn), true
	case signal.Fault:
		return state(d.fault != noFault), true
	case signal.FaultCode:
		return float64(d.fault), true
	case signal.Mode:
		if !r.Released {
			return signal.ModeOff, true
		}
		if r.Mode == circuit.VoltageMode {
			return signal.ModeVoltage, true
		}
		return signal.ModeCurrent, true
	case signal.VoltageSetpoint:
		return d.setpoint, true
	case signal.DroopSetting:
		return d.droop, true
	case signal.PowerReference:
		return d.power, true
	case signal.ChargeLimit:
		return d.charge, true
	case signal.DischargeLimit:
		return d.discharge, true
	}
	return math.NaN(), false
}

// peerValue is a signal of another infeed's device, without its sensor's error.
func (s *Simulator) peerValue(k int, n signal.Name, r circuit.Reading) (float64, bool) {
	i := r.InfeedCurrents[k]
	in := s.truth.site.Infeeds[k+1]
	terminal := r.BusVoltage + s.truth.cables[k]*i
	switch n {
	case signal.BusVoltage:
		return terminal, true
	case signal.BusCurrent:
		return i, true
	case signal.Power:
		return terminal * i, true
	case signal.Running, signal.Ready, signal.BypassClosed:
		return state(s.plant.InfeedOn(k)), true
	case signal.Mode:
		return state(s.plant.InfeedOn(k)) * signal.ModeVoltage, true
	case signal.VoltageSetpoint:
		return float64(in.Setpoint.Nominal), true
	case signal.DroopSetting:
		return float64(in.Droop.At(s.truth.site.Bus.Nominal.Nominal, in.RatedCurrent.Nominal)), true
	case signal.Fault, signal.FaultCode:
		return 0, true
	}
	return 0, false
}

package simulator

import (
	"fmt"
	"strconv"
	"strings"
)

// Disturbance is one thing that is wrong with the plant, its device or its link.
type Disturbance struct {
	Name string
	Size float64 // in the unit of its DisturbanceInfo
}

// String is the disturbance as it is typed.
func (d Disturbance) String() string { return d.Name + "=" + strconv.FormatFloat(d.Size, 'g', -1, 64) }

// Groups of disturbances.
const (
	PrechargeGroup = "pre-charge"
	BridgeGroup    = "source and bridge"
	DroopGroup     = "droop"
	ReadingGroup   = "readings"
)

// DisturbanceInfo is a line of the list of disturbances.
type DisturbanceInfo struct {
	Name        string
	Group       string
	Meaning     string // what it stands for on site
	SizeMeans   string // what the size says
	DefaultSize float64
	Unit        string  // of the size; "1" for a fraction or a number
	Least, Most float64 // of the size
}

// entry is a disturbance with what it does to the truth.
type entry struct {
	DisturbanceInfo
	apply func(t *truth, size float64) error
}

// Disturbances are all disturbances in the order of the design.
func Disturbances() []DisturbanceInfo {
	list := make([]DisturbanceInfo, len(catalogue))
	for k, e := range catalogue {
		list[k] = e.DisturbanceInfo
	}
	return list
}

func find(name string) (entry, bool) {
	for _, e := range catalogue {
		if e.Name == name {
			return e, true
		}
	}
	return entry{}, false
}

// ParseDisturbance reads one disturbance, "resistor-high" or "resistor-high=0.3".
func ParseDisturbance(text string) (Disturbance, error) {
	name, size, sized := strings.Cut(strings.TrimSpace(text), "=")
	e, known := find(name)
	if !known {
		return Disturbance{}, fmt.Errorf("disturbance %q is not known, see rehearse --list-disturbances", name)
	}
	d := Disturbance{name, e.DefaultSize}
	if sized {
		v, err := strconv.ParseFloat(size, 64)
		if err != nil || !(v >= e.Least && v <= e.Most) {
			return Disturbance{}, fmt.Errorf("disturbance %s: size %q, want a number from %g to %g (%s)", name, size, e.Least, e.Most,
				e.SizeMeans)
		}
		d.Size = v
	}
	return d, nil
}

// ParseDisturbances reads a list of disturbances separated by commas.
func ParseDisturbances(text string) ([]Disturbance, error) {
	var list []Disturbance
	for part := range strings.SplitSeq(text, ",") {
		if strings.TrimSpace(part) == "" {
			continue
		}
		d, err := ParseDisturbance(part)
		if err != nil {
			return nil, err
		}
		list = append(list, d)
	}
	return list, nil
}

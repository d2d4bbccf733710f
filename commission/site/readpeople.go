package site

import (
	"net"
	"regexp"
	"strconv"

	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

// stageTitles are the stages of the walk (design, section 7), which a [[point]] names by title or number.
var stageTitles = []string{"Permission and safety", "Papers against nameplates", "Dead checks", "Link", "Pre-charge", "Window",
	"First boost and voltage mode", "Droop and sharing", "Current mode", "Trips and interlocks", "Shut-down and discharge",
	"Punch list, as-left, sign-off"}

func readInstruments(rows []*document.Table) []Instrument {
	var instruments []Instrument
	names := unique{}
	for _, t := range rows {
		var i Instrument
		t.Text("name", &i.Name, "hand multimeter")
		t.Text("serial", &i.Serial, "HM-0417")
		t.Text("category", &i.Category, "CAT III")
		t.Date("calibrated", &i.Calibrated)
		t.Date("due", &i.Due)
		readAccuracy(t.Table("accuracy"), &i)
		document.Quantity(t, "max_voltage", &i.MaxVoltage, volts("1500 V"))
		t.Require(`name = "hand multimeter"`)
		names.check(t, "name", i.Name, "instrument")
		if !i.Calibrated.IsZero() && !i.Due.IsZero() && i.Due.Before(i.Calibrated) {
			t.Refuse("due", "a date after calibrated", "due = 2027-03-01")
		}
		instruments = append(instruments, i)
	}
	return instruments
}

func readAccuracy(t *document.Table, i *Instrument) {
	if t == nil {
		return
	}
	var ofReading quantity.Entered[quantity.Ratio]
	document.Quantity(t, "of_reading", &ofReading, amount(0, 0, "0.05 %"))
	document.Quantity(t, "plus", &i.Plus, amount(1e-6, 100, "0.1 V"))
	atMostAll(t, "of_reading", ofReading)
	if !t.Has("of_reading") && !t.Has("plus") {
		t.Require(`of_reading = "0.05 %"`)
	}
	i.OfReading = ofReading.Nominal
	i.HasAccuracy = ofReading.IsGiven() || i.Plus.IsGiven()
}

func readPeople(rows []*document.Table) []Person {
	var people []Person
	for _, t := range rows {
		var p Person
		document.Choice(t, "role", &p.Role, "technician", "witness", "surveyor", "owner")
		t.Text("name", &p.Name, "A. Example")
		t.Text("organisation", &p.Organisation, "Example Works")
		t.Text("key", &p.Key, "SHA256:…")
		t.Require(`role = "technician"`, `name = "A. Example"`)
		people = append(people, p)
	}
	return people
}

var pointID = regexp.MustCompile(`^[a-z0-9]+([.-][a-z0-9]+)*$`)

func readPoints(rows []*document.Table) []OwnPoint {
	var points []OwnPoint
	ids := unique{}
	for _, t := range rows {
		var p OwnPoint
		t.Text("id", &p.ID, "own.torque")
		if t.IsText("stage") {
			document.Choice(t, "stage", &p.Stage, stageTitles...)
		} else {
			var n int
			t.Whole("stage", &n, 1, len(stageTitles))
			if n > 0 {
				p.Stage = strconv.Itoa(n)
			}
		}
		document.Choice(t, "kind", &p.Kind, "hold", "witness", "check")
		t.Text("what", &p.What, "Torque of the bus connections")
		t.Text("accept", &p.Accept, "25 N·m, marked")
		t.Text("caution", &p.Caution, "Dead, earthed and locked")
		t.Text("basis", &p.Basis, "the yard's drawing 17")
		t.Require(`id = "own.torque"`, "stage = 3", `kind = "hold"`, `what = "Torque of the bus connections"`)
		if p.ID != "" && !pointID.MatchString(p.ID) {
			t.Refuse("id", "lower-case letters, digits, dots and hyphens", `id = "own.torque"`)
		}
		ids.check(t, "id", p.ID, "point")
		points = append(points, p)
	}
	return points
}

func readPeers(rows []*document.Table, infeeds []Infeed) []Peer {
	var peers []Peer
	seen := unique{}
	known := make([]string, len(infeeds))
	for i, infeed := range infeeds {
		known[i] = infeed.Name
	}
	for _, t := range rows {
		p := Peer{UnitID: 1}
		if len(known) > 0 {
			document.Choice(t, "infeed", &p.Infeed, known...)
		} else {
			t.Text("infeed", &p.Infeed, "shore rectifier")
			t.Refuse("infeed", "the name of an [[infeed]]; the file has none", "")
		}
		readAddress(t, &p.Address, &p.UnitID)
		t.Text("map", &p.Map, "shore.map.toml")
		t.Require(`infeed = "shore rectifier"`, `address = "192.0.2.22:502"`, `map = "shore.map.toml"`)
		seen.check(t, "infeed", p.Infeed, "peer")
		peers = append(peers, p)
	}
	return peers
}

func readDevice(t *document.Table) *Device {
	if t == nil {
		return nil
	}
	d := Device{UnitID: 1, MaxAge: quantity.Entered[quantity.Seconds]{Spread: quantity.Exactly(500e-3 * quantity.Second), Text: "500 ms"}}
	readAddress(t, &d.Address, &d.UnitID)
	t.Text("map", &d.Map, "wagtail.map.toml")
	document.Quantity(t, "max_age", &d.MaxAge, limit(10e-3, 60, "500 ms"))
	t.Require(`address = "192.0.2.21:502"`, `map = "wagtail.map.toml"`)
	return &d
}

// readAddress reads host:port and the Modbus unit identifier.
func readAddress(t *document.Table, address *string, unit *uint8) {
	t.Text("address", address, "192.0.2.21:502")
	if *address != "" {
		host, port, err := net.SplitHostPort(*address)
		number, numberErr := strconv.ParseUint(port, 10, 16)
		if err != nil || numberErr != nil || number == 0 || host == "" {
			t.Refuse("address", "host:port, the port from 1 to 65535 (Modbus TCP has 502)", `address = "192.0.2.21:502"`)
		}
	}
	id := int(*unit)
	t.Whole("unit_id", &id, 0, 255)
	*unit = uint8(id)
}

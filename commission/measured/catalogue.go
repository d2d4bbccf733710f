package measured

import "chargehand/commission/finding"

// known says of each cause what would confirm it and what is safe to do next. The names are the vocabulary of design 10.
var known = map[string]struct{ confirm, safe string }{
	"resistor-open":       {"resistance across the pre-charge path, dead", "open the isolator, prove dead, measure resistor, its contactor and fuse"},
	"resistor-high":       {"measure the resistor cold, four-wire", "let it cool; compare with its plate before another attempt"},
	"resistor-low":        {"measure the resistor cold, four-wire; look for a wrong tap or two in parallel", "do not repeat: the peak power is higher than the resistor was chosen for"},
	"resistor-drifts-hot": {"measure cold and again hot; the time constant returns after three thermal time constants", "no further attempt before it is cold"},
	"bank-missing":        {"measure the capacitance of each bank, dead; discharge time constant shorter by the same share", "find the isolated bank's switch and fuse before loads are released"},
	"bank-added":          {"list what else hangs on the bus; discharge time constant longer by the same share", "check the resistor's pulse rating for the larger energy before another attempt"},
	"load-left-on":        {"switch the loads off one by one; after opening, the bus falls with R_b·C", "open the pre-charge: the resistor burns as long as it lasts; find the load"},
	"auxiliary-stall":     {"note the upper and lower level: the auxiliary supply's start and stop voltage", "open the pre-charge; feed the auxiliary supply from elsewhere or raise its start voltage"},
	"bus-shorted":         {"resistance of the bus, dead, both polarities", "open at once; no second attempt before the short is found"},
	"bus-shorted-late":    {"insulation and resistance of each bank at its voltage", "open at once; look for a broken-down capacitor or diode"},
	"bypass-welded":       {"resistance across the bypass with isolators open; auxiliary contact against the main contact by hand", "open the isolator at no current; do not close anything before the contacts are inspected"},
	"bypass-early":        {"compare the closing command with the voltage across the contact", "do not open under current; stop and inspect the contacts for welding"},
	"bypass-never":        {"is the closing command there? coil, auxiliary supply, interlock", "open the pre-charge; count it as an attempt"},
	"bypass-drops-out":    {"coil voltage while closed, contact of the holding circuit", "block the pulses: the resistor must not carry the load"},
	"precharge-welded":    {"resistance across the pre-charge contactor, isolators open", "open the isolator; the contactor is to be replaced before another attempt"},
	"bus-live":            {"voltage of the bus with the source isolated: it stands still", "find the infeed that holds the bus; charge only the filter, and compare across the bypass"},
	"bus-still-charged":   {"watch the bus: it falls with R_b·C while a live one stands still", "wait for the discharge, or judge the charge from this voltage"},
	"load-returns-early":  {"which load reports running at that instant? its under-voltage release", "hold the loads off until the bypass reports closed"},
	"fuse-open":           {"voltage across the source fuse, its indicator", "open the isolator, prove dead, find why it blew before replacing it"},

	"source-low":           {"open-circuit voltage at the source with an instrument", "charge the source, or find the missing module"},
	"source-soft":          {"internal resistance of the source, module by module", "no full load before the weak module or joint is found: it heats"},
	"source-reversed":      {"polarity at the open bypass with an instrument", "open the isolator; never close the bypass: dead short through the lower diodes"},
	"source-opens":         {"the source's own contactor and its controller's log", "block the pulses; ask the source's controller why it opened"},
	"charger-refuses":      {"the source controller's charge limit at that instant", "regeneration has nowhere to go but the chopper: prove the chopper first"},
	"choke-open":           {"resistance of each choke and its joints, dead", "no load: the other phases carry all"},
	"choke-unequal":        {"inductance of each choke; ripple of the sum at the switching frequency", "check the peak current against saturation with the unequal choke"},
	"filter-missing":       {"capacitance at the star point, dead", "limit the power: the ripple goes into the source"},
	"upper-switch-shorted": {"resistance from star point to bus plus, dead, both polarities", "never close the bypass: the bus would drive the source uncontrolled"},
	"lower-switch-shorted": {"resistance from star point to minus, dead, both polarities", "open at once; never close the bypass"},
	"bleeder-open":         {"resistance of each bleeder, dead", "the bus stays charged much longer than the label says: discharge by hand and prove dead"},
	"chopper-dead":         {"the chopper's resistor and its switch, dead", "no regeneration before the chopper works"},
	"earth-fault":          {"each pole to earth; open the isolator and see which side keeps the fault", "find the first earth fault before there is a second"},
	"contact-report-false": {"voltage across the contact against its report; auxiliary contact by hand", "trust neither before both agree"},

	"droop-mismatch": {"read the droop setting back and compare with the slope", "correct the setting, then repeat the steps"},
	"droop-off":      {"read the droop setting back: zero, or isochronous", "limit the current: this unit takes all of the load"},
	"setpoint-shifted": {"read the setpoint back, and compare the bus voltage with an instrument at no load",
		"move the setpoint by the stated amount, then repeat the steps"},
	"limit-too-low": {"read the current limits back", "keep the load below the kink"},
	"infeed-lost":   {"is the other infeed's breaker closed, does it run?", "reduce the load to what the remaining infeeds carry"},
	"bus-hunts":     {"frequency against the filter's resonance; more capacitance or less load calms it", "reduce the load until it is calm"},

	"words-swapped":       {"swap the words in the map and read again", "correct the map's word order before anything else is believed"},
	"address-shifted":     {"compare one known value by hand; read the neighbouring registers", "correct the map's addresses"},
	"scale-tenfold":       {"compare one value with an instrument", "correct the map's scale"},
	"sign-unsigned":       {"read the raw word: above 32767", "set the signed type in the map"},
	"current-reversed":    {"a charge of the bus must read as positive current", "set sign_reversed in the map"},
	"missing-code-read":   {"read the raw word: the device's code for 'no value'", "enter the code as missing in the map"},
	"torn-words":          {"both words in one request", "do not believe single outliers of this signal"},
	"answers-one-behind":  {"ask one register twice, then another: does the answer belong to the question before?", "drop the connection and begin anew"},
	"readings-frozen":     {"does the device's counter move? compare with its own display", "believe none of the readings; reconnect"},
	"readings-slow":       {"the time between two changes of a moving value", "trust no reading younger than its renewal"},
	"gateway-repeats-old": {"the device's counter seen through the gateway stands still, then leaps", "ask the gateway for its cache time; read the device directly"},
	"sensor-gain":         {"compare at two levels with an instrument: same ratio", "correct the transducer or its scaling, then repeat"},
	"sensor-offset":       {"compare at two levels with an instrument: same difference", "zero the transducer, then repeat"},
	"link-drops":          {"cable, switch and the device's connection limit", "no charge without a sound link"},

	notKnown: {"keep the capture; compare each signal with an instrument", "no further attempt before the cause is known"},
}

const notKnown = "not-known"

// weight is what the first cause alone makes of a finding: faults that lie in the readings leave the plant undecided, as does
// a bus that was not dead; a link that drops beside a good curve is marginal.
func weight(causes []finding.Cause) finding.Verdict {
	switch causes[0].ID {
	case "readings-frozen", "readings-slow", "gateway-repeats-old", "words-swapped", "address-shifted", "answers-one-behind", "missing-code-read",
		"torn-words", "sign-unsigned", "bus-live", "bus-still-charged":
		return finding.Undecided
	case "link-drops":
		return finding.Marginal
	}
	return finding.Fail
}

// spoilsClosing are causes that make the difference across the bypass untrue, or the instant of its closing.
var spoilsClosing = map[string]bool{"readings-frozen": true, "readings-slow": true, "gateway-repeats-old": true, "link-drops": true, "scale-tenfold": true,
	"address-shifted": true, "sensor-gain": true, "sensor-offset": true, "contact-report-false": true, "bypass-welded": true, "precharge-welded": true,
	"bus-live": true, "source-reversed": true, "source-opens": true, "bus-shorted-late": true}

// because is one cause with its evidence.
func because(id string, score float64, evidence ...string) finding.Cause {
	k := known[id]
	return finding.Cause{ID: id, Score: score, Evidence: evidence, Confirm: k.confirm + "; next: " + k.safe}
}

// together names causes that the signals at hand cannot tell apart, with the reading that parts them.
func together(score float64, parted string, evidence []string, ids ...string) []finding.Cause {
	var group []finding.Cause
	for _, id := range ids {
		c := because(id, score, evidence...)
		c.Confirm = "cannot be told apart here: " + parted + "; " + c.Confirm
		group = append(group, c)
	}
	return group
}

// lowered puts causes behind those that explain the numbers themselves.
func lowered(causes []finding.Cause) []finding.Cause {
	var out []finding.Cause
	for _, c := range causes {
		c.Score *= 0.3
		out = append(out, c)
	}
	return out
}

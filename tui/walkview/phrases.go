package walkview

import (
	"strings"

	"chargehand/commission/walk"
)

// phrases are texts to begin with at the points where something seen or a document is entered. A blank "__" in one must be
// written over before it is taken, so a prepared text never becomes a tick without a value.
var phrases = map[string][]string{
	"safe.permit": {"permit no. __, valid until __, in charge: __"},
	"safe.sources": {"live sources: battery, __; points of isolation: __; shafts locked: __",
		"sources as on drawing __; each with its point of isolation"},
	"safe.isolate": {"all poles disconnected at __; lock and tag no. __; proved dead; earthed at __",
		"locks no. __; no earthing, because __"},
	"safe.dead":        {"tester __ proved on __ before and after; all places dead"},
	"safe.arc":         {"boundary __ m, clothing __, from study __"},
	"safe.stop":        {"__ stands at the emergency stop; words: __; radio channel __"},
	"safe.instruments": {"meter __, calibrated until __, CAT __; leads whole and fused"},

	"paper.source":    {"plate and data sheet agree with the site file; read from __", "differs in __; site file changed"},
	"paper.plates":    {"converter __, choke __, resistor __; as the site file", "differs in __; site file changed"},
	"paper.banks":     {"__ banks found, as listed; isolated: __", "differs in __; site file changed"},
	"paper.fuse":      {"fuse __, sound; indicator wired to __"},
	"paper.switching": {"isolator __, pre-charge contactor __, bypass __; polarity marked: __"},
	"paper.settings":  {"saved as __ on __"},
	"paper.findings":  {"findings read by __; cautions accepted: __"},

	"dead.joints":     {"torqued and marked by __; bonding __ mΩ, limit __ mΩ"},
	"dead.polarity":   {"rung through with __: plus is plus at source, bypass, star point, bus and __"},
	"dead.chokes":     {"__ mH, __ mH, __ mH; __ mΩ each; separate cores"},
	"dead.bridge":     {"leg voltages __ V, __ V, __ V forward; reverse blocks"},
	"dead.bus":        {"climbs from __ Ω to __ Ω; reversed __ V; star point likewise"},
	"dead.contactors": {"both free and open; across the open bypass __ MΩ; auxiliary contacts follow"},
	"dead.discharge":  {"bleeder __ kΩ; no switch between"},
	"dead.insulation": {"at __ V: plus __ MΩ, minus __ MΩ; limit __ MΩ"},
	"dead.monitor":    {"active: __; off and marked: __; response value __ kΩ"},
	"dead.interlocks": {"each acts, tried by __; proved by __ instead: __"},
	"dead.stop":       {"stop and fault output tried at __; nothing restarts"},
	"dead.ready":      {"removed: __ earths, __ short-circuits, __ leads; count agrees; covers on"},

	"link.answer": {"plug pulled at __; every value withdrawn within __ s"},
	"link.known":  {"display read by __"},

	"charge.source":     {"polarity right at the open bypass; source __ V"},
	"charge.bus-state":  {"dead", "still charged, falls with __ s", "live, held by __"},
	"charge.insulation": {"__ kΩ; test alarms at __"},
	"charge.clear":      {"everybody has answered: __; abort hand: __"},

	"rest.limits": {"charge __ A, discharge __ A given now, because __"},

	"boost.clear":  {"turned down to __ A and __ kW; to be put back at leave.settings"},
	"boost.ripple": {"choke __ A, source __ A rms, bus __ V; phases alike; nothing grows near resonance"},

	"share.couple": {"polarity same; difference __ V across the open tie"},
	"share.keyed":  {"nothing was changed", "keyed by __: setpoint __ V, droop __ V/A"},

	"power.limits": {"asked for __ A and __ A; held at __ A and __ A; ramp __ A/s"},
	"power.heat":   {"after __ min: chokes __ °C, bridge __ °C, joints __ °C, resistor __ °C"},

	"trip.stop":         {"at __ kW: pulses, then contactors after __ ms; no restart on reset"},
	"trip.time-out":     {"opened after __ s"},
	"trip.bypass-lost":  {"pulses blocked after __ ms; resistor stays at __ °C"},
	"trip.voltage":      {"chopper at __ V, over-voltage at __ V, under-voltage at __ V; thresholds put back"},
	"trip.source":       {"power zero after __ ms, its contactor opened after __ ms"},
	"trip.earth":        {"alarm with __ kΩ on plus and on minus, right pole shown"},
	"trip.control-loss": {"link lost: __; supply lost: __; bypass did not open under current"},

	"down.order": {"power zero, pulses blocked, bypass open, pre-charge open, infeeds off, isolators locked with no. __"},
	"down.label": {"labels on __ doors say __ min"},
	"down.dead":  {"tester __ proved on __ before and after; all places dead"},

	"leave.settings": {"saved as __; put back: __"},
	"leave.plant":    {"counted out: __ leads, __ locks, __ earths; covers on"},
	"leave.punch":    {"read by __; nothing forbids operation"},
	"leave.handover": {"explained to __, operator"},
}

// prepared are the texts to begin with at a point: its own, and what a site's own point wants.
func prepared(p walk.Point) []string {
	if own := phrases[p.ID]; own != nil {
		return own
	}
	return []string{"__"}
}

// rehearsed is the text that a rehearsal may use at a point: it says that it was one.
func rehearsed(p walk.Point) string { return "rehearsed: " + strings.ToLower(p.Title) }

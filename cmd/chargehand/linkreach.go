package main

import (
	"fmt"

	"chargehand/protocol/link"
)

// noAnswer says in words what kind of no answer a failure is, and what to do about it.
func noAnswer(err error, peer string, unit uint8) (what, todo string) {
	switch link.KindOf(err) {
	case link.NoHost:
		return "no host: nothing answers at " + peer,
			"check cable, power, the address in [device], and that this computer is in the same network"
	case link.NoService:
		return fmt.Sprintf("no service: a host is there, but it refuses connections at %s", peer),
			"check the port (502 by default), and that Modbus TCP is switched on in the device"
	case link.Taken:
		return fmt.Sprintf("connection taken: %s accepts a connection and ends it without an answer", peer),
			"another client may hold the device's only connection: end it, or the device admits only listed addresses"
	case link.NoUnit:
		return fmt.Sprintf("no unit: a gateway at %s says that unit %d does not answer", peer, unit),
			"check unit_id in [device], and the power and serial line of the device behind the gateway"
	case link.Silent:
		return fmt.Sprintf("no unit, or silent: %s takes the connection but unit %d never answers", peer, unit),
			"check unit_id in [device] (1 is usual; 255 or 0 for a plain device), then the line behind a gateway"
	case link.NoRegister:
		return fmt.Sprintf("no register: unit %d at %s answers, but has not got what the map asks for", unit, peer),
			"compare the map's tables and addresses with the device's list"
	case link.DeviceRefuses:
		return fmt.Sprintf("the device refuses: unit %d at %s answers with an exception", unit, peer),
			"it may be starting up or busy; try again, then look at the device itself"
	case link.WrongAnswer:
		return fmt.Sprintf("wrong answer: what answers at %s does not keep to the protocol", peer),
			"check that it is a Modbus TCP server, not a serial one over TCP, and that no other client shares the line"
	case link.ConnectionLost:
		return fmt.Sprintf("connection lost: %s ended it in the middle", peer),
			"check cable and switch; another client may have taken the connection"
	case link.NotSent:
		return "not sent: the request was refused by this program", "check the addresses of the map"
	}
	return fmt.Sprintf("no answer from %s", peer), "check address, port and unit identifier"
}

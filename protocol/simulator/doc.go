// Package simulator is a converter that can be read over Modbus TCP: the circuit of package circuit behind the register
// map of a site, with the sequence of a device, the errors of its sensors and the habits of its link.
//
// Start at [New] and [Simulator.Serve]. The operator's hand is [Simulator.Do] with an [Act], which [ParseAct] reads from a
// line of text; a hand instrument is [Simulator.Measure]. What is wrong with the plant is a list of [Disturbance].
//
// # Time
//
// The plant advances by the differences of the clock it is given, on a fixed grid of 2 ms, so that the same acts at the
// same plant times give the same plant whatever the speed of the clock. Random numbers (true values within the site's
// tolerances, noise, jitter) come from the seed alone.
//
// # Registers
//
// The image of the registers is refreshed every [Options.Refresh], ten per cent sooner or later, with noise and the
// quantisation of the map. Addresses between two points of a table that lie no further apart than the map's max_gap read 0;
// any other unknown address answers exception 2. Another unit answers exception 11. Every write is counted and refused with
// exception 1, but for the simulated device's own command coils, which no map of a real device has:
//
//	61440  isolator          1 closes, 0 opens
//	61441  pre-charge        1 closes, 0 opens
//	61442  bypass            1 closes, 0 opens
//	61443  pulses            1 releases, 0 blocks
//	61444  mode              0 voltage, 1 current
//	61445  other infeeds     1 all on, 0 all off
//	61446  discharge         1 shuts down and discharges
//	61447  emergency stop    1 stops
//	61448  reset             1 clears a fault
//	61449 … 61453  load      1 sets 0, 25, 50, 75, 100 % of load.power
//	61454, 61455  regenerate 1 sets 50, 100 % of load.regeneration
package simulator

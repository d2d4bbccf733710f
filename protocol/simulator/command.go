package simulator

import (
	"context"

	"chargehand/protocol/circuit"

	"github.com/simonvetter/modbus"
)

// commandCoils is the address of the first of the simulated device's own command coils.
const commandCoils = 61440

// commandActs are the acts of the command coils, when they are set and when they are cleared. A nil act is none.
func commandActs() [][2]*Act {
	both := func(v Verb) [2]*Act { return [2]*Act{{Verb: v, On: true}, {Verb: v}} }
	once := func(a Act) [2]*Act { return [2]*Act{&a, nil} }
	list := [][2]*Act{
		both(Isolator), both(Precharge), both(Bypass), {{Verb: Release, On: true}, {Verb: Block, On: true}},
		{{Verb: SetMode}, {Verb: SetMode, On: true}}, both(Infeed), once(Act{Verb: Discharge}), once(Act{Verb: EmergencyStop}),
		once(Act{Verb: Reset}),
	}
	for _, part := range []float64{0, 0.25, 0.5, 0.75, 1} {
		list = append(list, once(Act{Verb: Load, On: true, Value: part, Fraction: true}))
	}
	for _, part := range []float64{0.5, 1} {
		list = append(list, once(Act{Verb: Regenerate, On: true, Value: part, Fraction: true}))
	}
	return list
}

// command carries out a write to the command coils; any other write is refused.
func (s *Simulator) command(r *modbus.CoilsRequest) error {
	acts := commandActs()
	first := int(r.Addr) - commandCoils
	own := first >= 0 && first+int(r.Quantity) <= len(acts)
	s.link.mu.Lock()
	s.link.writes++
	if own {
		s.link.commands++
	}
	s.link.mu.Unlock()
	if !own {
		return modbus.ErrIllegalFunction
	}
	for k, on := range r.Args {
		act := acts[first+k][0]
		if !on {
			act = acts[first+k][1]
		}
		if act == nil {
			continue
		}
		if err := s.Do(context.Background(), *act); err != nil {
			return modbus.ErrServerDeviceFailure
		}
	}
	return nil
}

// commandStates is what the command coils read: the state that each commands, 0 for those that only do something once.
func (s *Simulator) commandStates(r *modbus.CoilsRequest) ([]bool, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	states := make([]bool, len(commandActs()))
	now := s.plant.Read()
	states[0], states[1], states[2] = now.IsolatorClosed, now.PrechargeCommand, now.BypassCommanded
	states[3], states[4] = now.Released, s.device.mode == circuit.CurrentMode
	for k := range s.truth.plant.Infeeds {
		states[5] = states[5] || s.plant.InfeedOn(k)
	}
	first := int(r.Addr) - commandCoils
	if first+int(r.Quantity) > len(states) {
		return nil, modbus.ErrIllegalDataAddress
	}
	return states[first : first+int(r.Quantity)], nil
}

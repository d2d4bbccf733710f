package window

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

// Source of the figures: public-cases.json, closed form, P19 and P20 confirmed by ngspice.
func TestPublicVoltageWindow(t *testing.T) {
	for _, c := range findingtest.Cases(t, "voltage_window") {
		v := func(name string) quantity.Voltage { return quantity.Voltage(c.Input(name, 0)) }
		a := func(name string) quantity.Current { return quantity.Current(c.Input(name, 0)) }
		r := func(name string) quantity.Resistance { return quantity.Resistance(c.Input(name, 0)) }
		n := v("n_cells")
		high := HighestTerminal(n*v("v_cell_max_V"), a("i_charge_A"), r("r_int_ohm"), v("meas_err_src_V"))
		low := LowestTerminal(n*v("v_cell_min_V"), a("i_discharge_A"), r("r_ext_ohm"), v("meas_err_src_V"))
		busLow := LowestBus(v("v_set_V"), v("droop_V"), v("reg_tol_V"), v("meas_err_bus_V"), v("ripple_pp_V"))
		busHigh := HighestBus(v("v_set_V"), v("droop_regen_V"), v("reg_tol_V"), v("meas_err_bus_V"), v("ripple_pp_V"))
		least := HardwareDuty(quantity.Frequency(c.In("f_sw_Hz")), quantity.Seconds(c.In("t_min_pulse_s")), quantity.Seconds(c.In("t_dead_s")))
		dutyLow, dutyHigh := Duty(high, busLow), Duty(low, busHigh)
		c.Check(t, map[string]any{
			"v_src_max_V": float64(high), "v_src_min_V": float64(low), "v_bus_min_V": float64(busLow), "v_bus_max_V": float64(busHigh),
			"margin_V": float64(busLow - high), "margin_ok": busLow-high >= v("margin_req_V"),
			"ratio_min": float64(busLow / high), "ratio_max": float64(busHigh / low), "duty_min": float64(dutyLow), "duty_max": float64(dutyHigh),
			"duty_hw_min": float64(least), "duty_low_ok": dutyLow >= least, "duty_high_ok": dutyHigh <= 1-least,
			"v_bus_min_for_duty_V": float64(high + DutyNeed(high, least)),
		})
	}
}

func TestPublicSourcePower(t *testing.T) {
	for _, c := range findingtest.Cases(t, "source_power") {
		emf, r := quantity.Voltage(c.In("emf_V")), quantity.Resistance(c.In("r_int_ohm"))
		eta := c.Input("eta", 1)
		bus := c.In("p_bus_W")
		power := bus / eta
		if bus < 0 {
			power = bus * eta
		}
		i, ok := CurrentAtPower(emf, r, quantity.Power(power))
		phases := c.Input("n_phases", 3)
		limits := Limits{Phase: quantity.Current(c.In("i_phase_max_A")), Phases: int(phases), Source: quantity.Current(c.In("i_src_max_A")),
			LeastTerminal: quantity.Voltage(c.In("v_term_min_V")), HighestTerminal: quantity.Voltage(c.In("v_term_max_V"))}
		available, at := AvailableDischarge(emf, r, quantity.Ratio(eta), limits)
		c.Check(t, map[string]any{
			"p_src_W": power, "solvable": ok, "i_src_A": float64(i), "v_term_V": float64(emf) - float64(r)*float64(i),
			"i_phase_A": float64(i) / phases, "i_bus_A": bus / c.In("v_bus_V"), "p_transfer_max_W": float64(emf*emf) / (4 * float64(r)),
			"p_avail_boost_W": float64(available), "i_at_p_avail_A": float64(at), "current_ok": i <= at,
		})
	}
}

func TestPublicDiodeConduction(t *testing.T) {
	for _, c := range findingtest.Cases(t, "diode_conduction") {
		loop := Conduction{EMF: quantity.Voltage(c.In("emf_V")), Bus: quantity.Voltage(c.In("v_bus_V")), Diode: quantity.Voltage(c.In("v_diode_V")),
			Source: quantity.Resistance(c.In("r_src_ohm")), Choke: quantity.Resistance(c.In("r_choke_ohm")), DiodeResistance: quantity.Resistance(c.In("r_diode_ohm")),
			ChokeInductance: quantity.Inductance(c.In("l_choke_H")), Stray: quantity.Inductance(c.In("l_stray_H")), Phases: int(c.Input("n_phases", 3))}
		trip, ok := loop.TimeTo(quantity.Current(c.In("i_trip_A")))
		if !ok {
			t.Errorf("%s: TimeTo = never, want a time", c.ID)
		}
		n := float64(loop.Phases)
		c.Check(t, map[string]any{
			"i_final_A": float64(loop.Final()), "i_phase_final_A": float64(loop.Final()) / n, "di_dt_A_s": loop.Slope(),
			"di_dt_phase_A_s": loop.Slope() / n, "tau_s": float64(loop.TimeConstant()), "t_trip_s": float64(trip),
		})
		if _, ok := loop.TimeTo(loop.Final()); ok {
			t.Errorf("%s: TimeTo(final current) = a time, want never", c.ID)
		}
	}
}

func TestPublicDutyLossy(t *testing.T) {
	for _, c := range findingtest.Cases(t, "duty_lossy") {
		source, bus := quantity.Voltage(c.In("v_src_V")), quantity.Voltage(c.In("v_bus_V"))
		d := DutyWithDrops(source, bus, quantity.Current(c.In("i_phase_A")), Drops{Resistance: quantity.Resistance(c.In("r_phase_ohm")),
			Switch: quantity.Voltage(c.In("v_ce_V")), Forward: quantity.Voltage(c.In("v_f_V"))})
		c.Check(t, map[string]any{"duty_boost": float64(d), "duty_upper": float64(1 - d), "duty_ideal": float64(Duty(source, bus))})
	}
}

// The Joule integral that TimeToJoule inverts is added up step by step (trapezoid, 200000 steps) from the current itself.
func TestTimeToJouleAgainstSummation(t *testing.T) {
	loop := Conduction{EMF: 720, Source: 0.06, Choke: 0.009, ChokeInductance: 0.4e-3, Stray: 5e-6, Phases: 3}
	for _, goal := range []quantity.CurrentTime2{1e-3, 10, 9e4, 5e6} {
		end := float64(loop.TimeToJoule(goal))
		const steps = 200000
		sum, dt := 0.0, end/steps
		for k := 0; k <= steps; k++ {
			i := float64(loop.Final()) * -math.Expm1(-float64(k)*dt/float64(loop.TimeConstant()))
			weight := 1.0
			if k == 0 || k == steps {
				weight = 0.5
			}
			sum += weight * i * i * dt
		}
		if math.Abs(sum-float64(goal)) > 1e-6*float64(goal) {
			t.Errorf("TimeToJoule(%v) = %v s, at which the integral is %v A²s, want the goal", goal, end, sum)
		}
	}
}

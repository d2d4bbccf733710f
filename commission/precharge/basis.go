package precharge

// Where each formula comes from, as findings show it.
const (
	basisCharge  = "RC charge through a resistor with a bleeder, τ = (R ∥ R_b)·C; textbook circuit theory (Kuphaldt, Lessons in Electric Circuits, vol. I, ch. 16)"
	basisLoad    = "RC charge with a constant-power load, v± = ½·[V_f ± √(V_f² − 4·R_e·P)]; derived from the circuit equation"
	basisPeak    = "Ohm's law on the empty bus, î = E⁄R, p̂ = R_p·î²"
	basisEnergy  = "∫ R_p·i² dt until the bypass closes; textbook circuit theory, constant power by partial fractions"
	basisPulse   = "equivalent rectangular pulse max(τ⁄2, E_R⁄p̂) against the maker's figures; common practice"
	basisThermal = "one-node thermal model, dθ⁄dt = (P·R_th − θ)⁄τ_th; textbook heat conduction"
	basisMean    = "mean power E_R⁄interval against the derated rating; linear derating as in IEC 60115-1, from memory"
	basisWait    = "greatest of charge time, thermal period of an unlimited series, E_R⁄(f·P_rated)"
	basisShort   = "constant power (E⁄R)²·R_p against the maker's pulse figures and the one-node thermal model; common practice"
	basisTimeout = "1.2 × slowest charge … least withstand ⁄ 1.25; common practice"
)

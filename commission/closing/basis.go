package closing

// Where each formula comes from, as findings show it.
const (
	basisLoop      = "series resonant circuit, î = u·√(C⁄L)·e^(−α·t_p); textbook circuit theory"
	basisI2t       = "series resonant circuit, I²t = C·u²·(1 − k²)⁄2R from the energy balance"
	basisBeyond    = "series resonant circuit with a diode, the link ends k·u above the source, k = e^(−α·π⁄ω_d)"
	basisThreshold = "window of the closing difference: settled difference + errors … making current ⁄ (î per volt) − errors; derived"
	basisDwell     = "RC charge of the filter through the pre-charge resistor, R·C_f·ln(E⁄δ); textbook circuit theory"
)

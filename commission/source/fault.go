package source

import "chargehand/commission/quantity"

// ShortCircuit is the prospective current at the terminals, E⁄R_i; infinite behind no resistance.
func ShortCircuit(emf quantity.Voltage, internal quantity.Resistance) quantity.Current {
	return quantity.Current(float64(emf) / float64(internal))
}

// FaultEnergy is what is released until a fuse pre-arcs at the prospective current: E·I·t with I²·t its pre-arcing
// integral, so R_i·I²t.
func FaultEnergy(internal quantity.Resistance, preArcing quantity.CurrentTime2) quantity.Energy {
	return quantity.Energy(float64(internal) * float64(preArcing))
}

package circuit

// Reading is what could be measured on the plant at one instant, without any instrument's error.
type Reading struct {
	Time              float64 // s
	EMF               float64 // V
	TerminalVoltage   float64 // V at the source's terminals, before fuse and isolator
	SourceVoltage     float64 // V at node A: after fuse and isolator, before the pre-charge
	StarVoltage       float64 // V
	BusVoltage        float64 // V
	BanksVoltage      float64 // V of the isolated banks
	FilterVoltage     float64 // V
	SourceCurrent     float64 // A
	PrechargeCurrent  float64 // A
	PhaseCurrents     []float64
	BusCurrent        float64 // A from the bridge to the bus
	Power             float64 // W from the bridge to the bus
	ResistorRise      float64 // K above ambient
	Drawn             float64 // C
	InfeedCurrents    []float64
	LoadPower         float64 // W taken by loads of constant power and resistance that are switched on
	IsolatorClosed    bool
	PrechargeMain     bool // the main contact
	PrechargeReported bool // the auxiliary contact
	BypassMain        bool
	BypassReported    bool
	BypassCommanded   bool
	PrechargeCommand  bool
	Released          bool
	Mode              Mode
	ChopperOn         bool
	AuxiliaryOn       bool
	LoadOn            bool
	FuseOpen          bool
	Shorted           bool
}

// Read looks at the circuit as it is now.
func (c *Circuit) Read() Reading {
	y := c.y
	emf, _ := c.electromotive(y[drawn])
	drop, _, _ := c.blockingDrop(y[iSource])
	pre, _, _ := c.paths(y)
	r := Reading{
		Time: c.time, EMF: emf, TerminalVoltage: emf - c.p.Source.Resistance*y[iSource] - drop, SourceVoltage: y[vNode],
		StarVoltage: y[vStar], BusVoltage: y[vBus], BanksVoltage: y[vBanks], FilterVoltage: y[vFilter],
		SourceCurrent: y[iSource], PrechargeCurrent: pre * (y[vNode] - y[vStar]),
		PhaseCurrents: append([]float64(nil), y[firstPhase:firstPhase+len(c.p.Chokes)]...),
		BusCurrent:    c.busCurrent(y), ResistorRise: y[rise], Drawn: y[drawn],
		InfeedCurrents: append([]float64(nil), y[firstPhase+len(c.p.Chokes):]...),
		LoadPower:      c.loadConductance * y[vBus] * y[vBus],
		IsolatorClosed: c.isolator.main, PrechargeMain: c.precharge.main, PrechargeReported: c.precharge.auxiliary,
		BypassMain: c.bypass.main, BypassReported: c.bypassReport(), BypassCommanded: c.bypass.commanded,
		PrechargeCommand: c.precharge.commanded, Released: c.released, Mode: c.mode, ChopperOn: c.chopperOn,
		AuxiliaryOn: c.auxiliaryOn, LoadOn: c.loadOn, FuseOpen: c.fuseOpen, Shorted: c.shorted,
	}
	r.Power = r.BusCurrent * r.BusVoltage
	if c.loadOn {
		r.LoadPower += c.loadPower
	}
	return r
}

// Energies are the integrals since New.
func (c *Circuit) Energies() Energies { return c.energy }

// Work is how much the integration has done: accepted steps, rejected steps, factorisations.
func (c *Circuit) Work() (steps, rejected, factorised int) {
	return c.step.Steps, c.step.Rejected, c.step.Factorised
}

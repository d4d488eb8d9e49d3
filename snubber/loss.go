package snubber

// Loss is where the power goes that the ring and its network cost, W. Conduction of the load current and the switch's
// own overlap of current and voltage are not in it.
//
// Total is the sum of the five places, and the sum of Added and Anyway. "C V^2 f" of the network's capacitor is Added
// alone: what the loop loses anyway goes into the resistor too, which runs hotter by that.
type Loss struct {
	Total    float64 // W: Resistor + ESR + Diode + Switch + Loop
	Resistor float64 // W: in the network's resistor
	ESR      float64 // W: in its capacitor
	Diode    float64 // W: in its diode
	Switch   float64 // W: in the switch, which discharges the node's capacitance at each turn-on
	Loop     float64 // W: in the loop's own loss resistance

	Added  float64 // W: because the network is there
	Anyway float64 // W: with or without it
	Saved  float64 // W: of the switch's own overlap, not in Total; 0 where Cycle.FallS is
}

// SwitchingLoss is LossOf at hz cycles a second, each edge settled before the next and the switch's resistance small
// beside the network's.
func SwitchingLoss(l Loop, n Network, e Excitation, hz float64) (Loss, error) {
	return LossOf(l, n, e, Cycle{Hz: hz})
}

// LossOf is the power that a loop with a network loses: EnergyOf, as often as the cycle comes.
func LossOf(l Loop, n Network, e Excitation, c Cycle) (Loss, error) {
	w, err := EnergyOf(l, n, e, c)
	if err != nil {
		return Loss{}, err
	}
	return w.times(c.Hz), nil
}

func (w CycleEnergy) times(hz float64) Loss {
	p := Loss{
		Resistor: hz * (w.Off.Resistor + w.On.Resistor),
		ESR:      hz * (w.Off.ESR + w.On.ESR),
		Diode:    hz * (w.Off.Diode + w.On.Diode),
		Switch:   hz * (w.Off.Switch + w.On.Switch),
		Loop:     hz * (w.Off.Loop + w.On.Loop),
		Added:    hz * w.Added,
		Anyway:   hz * w.Anyway,
		Saved:    hz * w.Saved,
	}
	p.Total = p.Resistor + p.ESR + p.Diode + p.Switch + p.Loop
	return p
}

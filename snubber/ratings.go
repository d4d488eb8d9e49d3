package snubber

import (
	"fmt"
	"math"
)

// Ratings are the least ratings of the parts to buy. A part that the network has not, or a stress that it does not
// bound, is zero and absent from JSON.
type Ratings struct {
	ResistorW     float64 `json:"resistor_w"`                // W to buy: at the ambient, twice the loss, next standard power above
	ResistorMeanW float64 `json:"resistor_mean_w,omitempty"` // W: its loss
	PulseJ        float64 `json:"pulse_j,omitempty"`         // J: its energy at the harder of the two edges
	ResistorPeakA float64 `json:"resistor_peak_a,omitempty"` // A
	ResistorPeakV float64 `json:"resistor_peak_v,omitempty"` // V
	ResistorH     float64 `json:"resistor_h,omitempty"`      // H: from this inductance on the resistor is no resistor to the ring

	CapacitorV     float64 `json:"capacitor_v"`                 // V: the highest voltage the capacitor sees
	CapacitorBuyV  float64 `json:"capacitor_buy_v,omitempty"`   // V to buy: half as much again, next common rating above
	CapacitorVPerS float64 `json:"capacitor_v_per_s,omitempty"` // V/s
	CapacitorPeakA float64 `json:"capacitor_peak_a,omitempty"`  // A
	CapacitorRMSA  float64 `json:"capacitor_rms_a,omitempty"`   // A
	StoredJ        float64 `json:"stored_j,omitempty"`          // J: what it holds when the switch is off
	LeadH          float64 `json:"lead_h,omitempty"`            // H: the inductance of leads and tracks that spoils the network
	LeadM          float64 `json:"lead_m,omitempty"`            // m: the length that has it, at 1 nH a millimetre

	DiodePeakA     float64 `json:"diode_peak_a,omitempty"`
	DiodeV         float64 `json:"diode_v,omitempty"`          // V: in reverse, while the capacitor discharges
	DiodeRecoveryS float64 `json:"diode_recovery_s,omitempty"` // s: its reverse recovery must be faster

	Advice []string `json:"advice,omitempty"` // a sentence each
}

// Common practice; the data sheet of the part decides.
const (
	deratesFromC = 70.0 // degrees Celsius up to which a resistor has its full rating
	hottestC     = 155.0
	capMargin    = 1.5 // of the highest voltage
	small        = 0.1 // what counts as small beside a whole: an inductance's share, a recovery's
	leadHPerM    = 1e-6
)

// RatingsOf is what the parts of a network must stand at an ambient temperature (degrees Celsius, where the resistor is).
//
//	resistor   twice its loss over the derating line, full to 70 degC and linear to zero at 155 degC (common practice)
//	           inductance R/(10 w0): a tenth of R at the bare ring, a phase of 6 degrees
//	capacitor  highest voltage and half as much again (common practice)
//	           leads L C/(10 Cs): its self-resonance then lies at sqrt(10) = 3.2 times the bare ring; 0.8 to 1 nH a
//	           millimetre (common practice)
//	diode      recovery in a tenth of the fitted ring's period, 2 pi sqrt(L (C + Cs))
//
// Peaks and currents at turn-off are TurnOff's, from an empty capacitor; at turn-on the capacitor discharges into the
// network's resistance and the switch's. A capacitor with no resistance in series at all discharges through the switch
// alone, which then bounds neither its current nor its dv/dt: those given are the turn-off's, and Advice says so. Bad
// values, an ambient of 155 degC or more, and a circuit that nothing damps (ErrNeverSettles) are errors.
func RatingsOf(l Loop, n Network, e Excitation, c Cycle, ambientC float64) (Ratings, error) {
	if !(ambientC > -273.15) || ambientC >= hottestC {
		return Ratings{}, fmt.Errorf("ratings at an ambient of %g degC: it must lie below %g degC, at which a usual resistor's rating ends", ambientC, hottestC)
	}
	w, err := EnergyOf(l, n, e, c)
	if err != nil {
		return Ratings{}, fmt.Errorf("ratings: %w", err)
	}
	if n.Kind == Bare {
		return Ratings{}, nil
	}
	turn, err := TurnOff(l, n, e)
	if err != nil {
		return Ratings{}, fmt.Errorf("ratings: %w", err)
	}
	var r Ratings
	u, ohm, w0 := w.high[1], n.SeriesOhm()+c.SwitchOhm, 2*math.Pi*l.NaturalHz()
	onA, onI2T := 0.0, 0.0
	switch {
	case n.SeriesOhm() > 0:
		onA, onI2T = u/ohm, (w.On.Resistor+w.On.ESR)/n.SeriesOhm()
	case ohm > 0: // its share of the current in the switch, which discharges the node with it
		share := n.C / (l.Capacitance + n.C)
		onA, onI2T = share*u/ohm, share*share*w.On.Switch/ohm
	}
	if n.Kind.HasR() {
		r.ResistorMeanW = w.times(c.Hz).Resistor
		r.ResistorW = powerRating(r.ResistorMeanW / derating(ambientC))
		r.PulseJ = math.Max(w.Off.Resistor, w.On.Resistor)
		r.ResistorPeakA = math.Max(turn.ResistorPeakA, onA)
		r.ResistorPeakV = r.ResistorPeakA * n.R
		r.ResistorH = small * n.R / w0
	}
	r.CapacitorV = math.Max(turn.CapacitorPeakV, e.Bus)
	r.CapacitorBuyV = voltageRating(capMargin * r.CapacitorV)
	r.CapacitorVPerS = math.Max(turn.CapacitorSlope, onA/n.C)
	r.CapacitorPeakA = math.Max(turn.CapacitorPeakA, onA)
	r.CapacitorRMSA = math.Sqrt(c.Hz * (turn.CapacitorI2T + onI2T))
	r.StoredJ = n.C * r.CapacitorV * r.CapacitorV / 2
	r.LeadH = small * l.Inductance * l.Capacitance / n.C
	r.LeadM = r.LeadH / leadHPerM
	if n.Kind == RCD {
		r.DiodePeakA = turn.DiodePeakA
		r.DiodeV = r.CapacitorV
		r.DiodeRecoveryS = small * 2 * math.Pi * math.Sqrt(l.Inductance*(l.Capacitance+n.C))
	}
	r.Advice = r.advice(n, ambientC, ohm == 0)
	return r, nil
}

// derating is what is left of a resistor's rating at an ambient, a fraction.
func derating(ambientC float64) float64 {
	return math.Min(1, (hottestC-ambientC)/(hottestC-deratesFromC))
}

// powerRating is the next standard resistor power above twice the loss, W; above the largest, twice the loss
// itself. Common practice; the data sheet's derating line decides.
func powerRating(w float64) float64 {
	return next(2*w, 0.0625, 0.1, 0.125, 0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 25, 50, 100)
}

// voltageRating is the next common capacitor rating at or above v, V; above the largest, v itself.
func voltageRating(v float64) float64 {
	return next(v, 16, 25, 50, 100, 200, 250, 400, 500, 630, 1000, 1500, 2000, 3000)
}

func next(v float64, ratings ...float64) float64 {
	for _, r := range ratings {
		if r >= v {
			return r
		}
	}
	return v
}

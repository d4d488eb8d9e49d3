package snubber

import (
	"fmt"

	"ringbook/snubber/quantity"
)

// advice says in sentences what the figures do not: kinds of part, what spoils them, and cautions.
func (r Ratings) advice(n Network, ambientC float64, unbounded bool) []string {
	var s []string
	say := func(format string, a ...any) { s = append(s, fmt.Sprintf(format, a...)) }
	in := func(v float64, u quantity.Unit) string { return quantity.Format(v, u, 2) }
	if n.Kind.HasR() {
		say("Take a non-inductive resistor (metal film, thick-film chip or carbon composition), not a wirewound one: from %s on its inductance counts beside its resistance at the ring.", in(r.ResistorH, quantity.Inductance))
		say("The resistor takes pulses of %s and %s: compare them with its pulse curve, which the mean power does not tell.", in(r.PulseJ, quantity.Energy), in(r.ResistorPeakA, quantity.Current))
		if f := derating(ambientC); f < 1 {
			say("At %g degC a usual resistor keeps %.0f %% of its rating (full to 70 degC, none at 155 degC: common practice); the data sheet's line decides.", ambientC, 100*f)
		}
	}
	say("Take a C0G (NP0) ceramic or a film capacitor: an X7R keeps its capacitance within 15 %% over temperature at no bias only, its code (EIA-198) says nothing of the capacitance it loses at the bus voltage, and the peak rises with what is lost.")
	say("Keep leads and tracks of the network below %s in all, about %.2g mm at 1 nH a millimetre (common practice): more brings the capacitor's own resonance near the ring.", in(r.LeadH, quantity.Inductance), r.LeadM*1e3)
	if unbounded {
		say("With no resistance in series the switch alone bounds the capacitor's current and dv/dt at turn-on, and takes its energy: the figures are those of the turn-off.")
	}
	if n.Kind == RCD {
		say("The diode must recover in less than %s, a tenth of the ring's period, and stand %s in reverse: a slow one rings again.", in(r.DiodeRecoveryS, quantity.Time), in(r.DiodeV, quantity.Voltage))
	}
	if n.Kind.HasR() {
		say("The resistor's surface may be hot enough to burn while it runs and for some time after.")
	}
	say("The network is live and its capacitor keeps up to %s (%s) after switching off: discharge it and measure before touching; local codes and licensed practice decide.", in(r.CapacitorV, quantity.Voltage), in(r.StoredJ, quantity.Energy))
	return s
}

package snubber

import (
	"errors"
	"fmt"
	"math"
)

// Turn is one edge of the switching node, from the instant the current is let go until all has settled at the bus.
type Turn struct {
	Peak   Peak    // highest voltage of the node
	Energy Energy  // J: where the energy of the edge goes
	Source float64 // J: what the bus gives during the edge

	ResistorPeakA  float64 // A: highest current of the network's resistor
	DiodePeakA     float64 // A: of its diode
	CapacitorPeakA float64 // A: of its capacitor
	CapacitorPeakV float64 // V: highest voltage of the capacitor, without its ESR
	CapacitorI2T   float64 // A^2 s: integral of its current squared; times the edges a second, its RMS current squared
	NodeSlope      float64 // V/s: steepest dv/dt of the node
	CapacitorSlope float64 // V/s: steepest dv/dt of the capacitor

	Waveform
}

// Energy is what each part turns into heat during one edge, J. The energies add up to what the bus gives and what the loop
// current brings, less what the capacitances keep:
//
//	Source + L I0^2/2 - (C + Cs) E^2/2
type Energy struct {
	Resistor float64 // J: the network's resistor
	ESR      float64 // J: its capacitor's equivalent series resistance
	Loop     float64 // J: the loop's loss resistance
	Diode    float64 // J: the network's diode, drop and on-resistance
}

// Total is the sum, J.
func (e Energy) Total() float64 { return e.Resistor + e.ESR + e.Loop + e.Diode }

// ErrNeverSettles is wrapped by the error for a circuit whose ring does not die away.
var ErrNeverSettles = errors.New("the ring does not die away")

const (
	stillLeft   = 1e-15  // of the energy of the edge: below this all has settled, and charge to the root of it
	maxSegments = 10_000 // of a diode's switchings
	maxGrowth   = 3e4    // of the parts of a response over the whole: its square is what an energy loses of 1e-16
	noAnswer    = 1e12   // the growth beyond which not even a peak is to be had
)

// nudges are what the loop's inductance is moved by, as a part of itself, where poles meet too closely for a sum over them:
// two poles that meet move apart by the root of it, three by the cube root.
var nudges = [...]float64{0, 1e-9, 1e-8, 1e-7}

// TurnOff is the edge of loop l with network n when the switch lets go of excitation e: peak, stresses and energies, all
// from closed forms. It takes the ESR, the resistor's own inductance and the diode, which Respond does not.
//
// It serves both ways in which a node is let go. At the turn-off of a switch the loop current is the load's, which the
// switch carried. At the turn-off of a diode (a step of the bus E with reverse recovery) the loop current is the recovery
// current Irr at the instant the diode lets go, from when on its voltage rises from zero: the same equations, with
// Excitation{Bus: E, Current: Irr}. McMurray's snubbers ("Optimum Snubbers for Power Semiconductors", IEEE Trans. Ind. Appl.
// IA-8, 593, 1972, from memory) are this with no capacitance at the node.
//
// Between two switchings of the network's diode the circuit is linear, its states sums of exponentials. The diode, on
// resistance in series with its drop, lies across the resistor: it lets the capacitor charge and makes it discharge through
// R. An instant of switching is the first zero of the diode's current (on) or of its voltage above its drop (off), found by
// steps that cannot pass a zero; so are the tops of every quantity. Energies are integrals of products of exponentials. No
// time is stepped, nothing sampled. Where poles meet, the inductance is moved by up to 1e-7 of itself to part them.
//
// The edge ends when less than 1e-15 of its energy is left. A circuit in which nothing damps wraps ErrNeverSettles.
func TurnOff(l Loop, n Network, e Excitation) (Turn, error) { return turnOff(l, n, e, 0) }

// turnOff is TurnOff with left volts on the network's capacitor from the edge before.
func turnOff(l Loop, n Network, e Excitation, left float64) (Turn, error) {
	if err := l.Check(); err != nil {
		return Turn{}, err
	}
	if err := n.Check(); err != nil {
		return Turn{}, err
	}
	if err := e.check(); err != nil {
		return Turn{}, err
	}
	if l.Resistance+n.SeriesOhm() == 0 {
		return Turn{}, fmt.Errorf("turn-off with neither a loop resistance nor a network's: %w; "+
			"give the loop the resistance that its decay shows", ErrNeverSettles)
	}
	var t Turn
	for i, nudge := range nudges {
		moved := l
		moved.Inductance *= 1 + nudge
		w := walk{c: newNormal(moved, n, e, left)}
		err := w.run()
		if err == nil && w.growth > noAnswer {
			err = errors.New("its poles meet so closely that no digits are left; change a value by a part in a million")
		}
		if w.growth > maxGrowth && i < len(nudges)-1 {
			continue
		}
		if err != nil {
			return Turn{}, fmt.Errorf("turn-off of network %s: %w", n.Kind, err)
		}
		t = w.turn(moved)
		break
	}
	return t, nil
}

// check reports the first value that no excitation can have.
func (e Excitation) check() error {
	if !(e.Bus >= 0) || math.IsInf(e.Bus, 0) {
		return fmt.Errorf("bus voltage %g V: it must be zero or a positive, finite number", e.Bus)
	}
	if !(e.Current >= 0) || math.IsInf(e.Current, 0) {
		return fmt.Errorf("loop current %g A: it must be zero or a positive, finite number", e.Current)
	}
	return nil
}

// walk goes through the segments of an edge and gathers what Turn reports, in units of w0, Z0 and volts.
type walk struct {
	c        *normal
	modes    [2]mode // the diode off, on
	segments []segment
	ends     float64
	growth   float64

	peak     float64 // above the bus, V
	peakAt   float64
	inner    float64
	resistor float64
	diode    float64
	branch   float64
	slope    float64

	sums
	tail tail
}

// sums are the integrals over the segments so far.
type sums struct {
	energy Energy
	charge float64 // of the loop current
	square float64 // of the network's squared
}

// segment is one stretch of an edge in which the diode does not switch.
type segment struct {
	from float64
	solution
}

func (w *walk) run() error {
	c := w.c
	w.peakAt = math.Inf(1)
	whole := c.stored(c.start)
	if whole == 0 {
		return nil
	}
	for i := range w.modes {
		if i == 1 && c.kind != RCD {
			break
		}
		var ok bool
		if w.modes[i], ok = c.mode(i == 1); !ok {
			w.growth = math.Inf(1)
			return nil
		}
	}
	on := 0
	if c.kind == RCD && c.drop == 0 && c.left == 0 {
		on = 1
	}
	x, now, turned := c.start, 0.0, 0
	var last [turnsOn]cycle // the latest first
	for c.stored(x) > stillLeft*whole {
		if len(w.segments) >= maxSegments {
			return fmt.Errorf("%w within %d switchings of the diode", ErrNeverSettles, maxSegments)
		}
		m := &w.modes[on]
		s, growth := c.from(m, x)
		w.growth = math.Max(w.growth, growth)
		if w.growth > noAnswer {
			return nil // digits enough for no answer: the next nudge's
		}
		end, final, err := w.end(&s, on == 1, whole)
		if err != nil {
			return err
		}
		if end == 0 {
			// It switches back at once: rounding, where the diode's current only touches zero.
			if turned++; turned > 2 {
				return errors.New("the instant at which its diode switches cannot be told")
			}
			on = 1 - on
			continue
		}
		turned = 0
		w.segments = append(w.segments, segment{now, s})
		if err := w.gather(&w.segments[len(w.segments)-1], end); err != nil {
			return err
		}
		now += end
		w.ends = now
		if final {
			break
		}
		x = s.state(end)
		if on = 1 - on; on == 1 && c.drop == 0 {
			this := cycle{now, x, w.sums}
			if w.repeat(last[:], this) {
				break
			}
			copy(last[1:], last[:])
			last[0] = this
		}
	}
	return nil
}

// end is when the diode switches, and whether it never does again.
func (w *walk) end(s *solution, on bool, whole float64) (end float64, last bool, err error) {
	if w.c.kind != RCD {
		return math.Inf(1), true, nil
	}
	// Where all has settled towards this mode's own rest.
	limit := math.Inf(1)
	if rate := s.slowest(); rate > 0 {
		limit = math.Log(2*math.Max(w.growth, 1)*math.Sqrt(1/stillLeft)) / rate
	}
	y := s.of(s.m.watch)
	want := -1.0
	if on {
		want = 1
	}
	known := want
	if len(w.segments) == 0 && w.c.drop+w.c.left > 0 {
		known = 0 // the edge does not begin at a switching
	}
	z := y.nextZero(0, limit, known)
	switch {
	case z.lost:
		return 0, false, fmt.Errorf("%w within %d steps", ErrNeverSettles, maxSteps)
	case z.sign != 0 && z.sign != want:
		return 0, false, nil
	case z.found:
		return z.t, false, nil
	}
	return math.Inf(1), true, nil
}

// slowest is the decay rate of the slowest pole.
func (s *solution) slowest() float64 {
	rate := math.Inf(1)
	for _, p := range s.m.p.s[:s.m.p.n] {
		rate = math.Min(rate, -real(p))
	}
	return rate
}

var (
	loopCurrent  = affine{k: state{1, 0, 0, 0}}
	nodeVoltage  = affine{k: state{0, 1, 0, 0}} // above the bus, as the next
	innerVoltage = affine{k: state{0, 0, 1, 0}}
)

// gather adds a segment of length T to the answer.
func (w *walk) gather(s *segment, T float64) error {
	c, m := w.c, s.m
	branch, resistor, diode, loop := s.of(m.branch), s.of(m.resistor), s.of(m.diode), s.of(loopCurrent)
	for _, q := range []struct {
		y   expSum
		top *float64
		at  *float64 // nil: the top of the size of y, not of y
	}{
		{s.of(nodeVoltage), &w.peak, &w.peakAt},
		{s.of(innerVoltage), &w.inner, new(float64)},
		{branch, &w.branch, nil},
		{resistor, &w.resistor, nil},
		{diode, &w.diode, nil},
		{s.of(loopCurrent.plus(-1, m.branch)), &w.slope, nil},
	} {
		ok := q.y.visit(T,
			func(least, most float64) bool {
				return most <= *q.top && (q.at != nil || -least <= *q.top)
			},
			func(t, v float64) {
				if q.at == nil {
					v = math.Abs(v)
				}
				if v > *q.top {
					*q.top = v
					if q.at != nil {
						*q.at = s.from + t
					}
				}
			})
		if !ok {
			return fmt.Errorf("%w within %d steps", ErrNeverSettles, maxSteps)
		}
	}
	square := branch.square(T)
	w.square += square
	w.charge += loop.integral(T)
	w.energy.Loop += c.loss * loop.square(T)
	w.energy.ESR += c.esr * square
	w.energy.Resistor += c.rho * resistor.square(T)
	w.energy.Diode += c.diode*diode.square(T) + c.drop*diode.integral(T)
	return nil
}

// turn is the answer in SI units.
func (w *walk) turn(l Loop) Turn {
	c := w.c
	joule := l.Capacitance // of V^2/Z0/w0
	t := Turn{
		Peak:           Peak{Volts: c.bus + w.peak, At: w.peakAt / c.w0},
		Source:         c.bus * w.charge * joule,
		ResistorPeakA:  w.resistor / c.z0,
		DiodePeakA:     w.diode / c.z0,
		CapacitorPeakA: w.branch / c.z0,
		CapacitorI2T:   w.square / (c.z0 * c.z0 * c.w0),
		NodeSlope:      w.slope * c.w0,
		Waveform:       Waveform{c, w.segments, w.ends, w.tail},
	}
	for _, x := range []struct {
		to   *float64
		from float64
	}{
		{&t.Energy.Resistor, w.energy.Resistor}, {&t.Energy.ESR, w.energy.ESR},
		{&t.Energy.Loop, w.energy.Loop}, {&t.Energy.Diode, w.energy.Diode},
	} {
		*x.to = math.Max(x.from*joule, 0) // rounding may leave less than nothing
	}
	if c.a > 0 {
		t.CapacitorPeakV = c.bus + w.inner
		t.CapacitorSlope = w.branch / c.a * c.w0
	}
	return t
}

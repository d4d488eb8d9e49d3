package snubber

import "math"

// falling is the response to a switch whose current falls linearly in a finite time. The response is linear in bus and
// current, so that it is the step of the bus and the mean of the current's steps over the fall:
//
//	v(t) = E-part(t) + (1/tf) integral of I-part(t - s) over s from 0 to tf
//
// The integral of the current's part b follows from the circuit's own equations, L i' = -b - r i and i = C b' + Cs u':
//
//	integral of b from 0 to t = L (I0 - i(t)) - r (C b(t) + Cs u(t))
type falling struct {
	v    *circuitValues
	bus  Response // of the bus alone
	amps Response // of the current alone
}

func newFalling(v *circuitValues) *falling {
	e, i := *v, *v
	e[atI0], i[atE] = 0, 0
	return &falling{v: v, bus: e.respond(), amps: i.respond()}
}

func (f *falling) at(t float64) float64 {
	v := f.bus.NodeAt(t)
	tf := f.v[atFall]
	if tf == 0 {
		return v + f.amps.NodeAt(t)
	}
	return v + (f.integral(t)-f.integral(t-tf))/tf
}

func (f *falling) integral(t float64) float64 {
	if t <= 0 {
		return 0
	}
	b := f.amps.modes.basis(f.amps.w0 * t)
	v, u := f.amps.node.at(b), f.amps.inner.at(b)
	return f.v[atL]*(f.v[atI0]-f.amps.loop.at(b)/f.amps.z0) - f.v[atR]*(f.v[atC]*v+f.v[atCs]*u)
}

// slope is the derivative of v, V/s.
func (f *falling) slope(t float64) float64 {
	s := f.bus.w0 * f.bus.modes.slope(f.bus.node, f.bus.modes.basis(f.bus.w0*t))
	tf := f.v[atFall]
	if tf == 0 {
		return s + f.amps.w0*f.amps.modes.slope(f.amps.node, f.amps.modes.basis(f.amps.w0*t))
	}
	return s + (f.amps.NodeAt(t)-f.amps.NodeAt(t-tf))/tf
}

// peak is the highest voltage, walked to as highest has it.
func (f *falling) peak() (when, volts float64) {
	m, w0 := f.bus.modes, f.bus.w0
	rate, slow := m.slowest(), m.slowest()
	if m.third {
		rate, slow = math.Max(rate, -m.p), math.Min(slow, -m.p)
	}
	period, end := 2*math.Pi/rate, 60/slow
	if m.q > 0 {
		period = 2 * math.Pi / math.Sqrt(m.q)
		end = 1.5 * period
	}
	return highest(f.v[atE], f.v[atFall]+end/w0, math.Min(period, 2*math.Pi/rate)/w0/16, f.slope, f.at)
}

// highest walks from 0 to end in the given step, or in four thousandths of the way where that is longer, and gives the
// highest top met on the way, each found by the secant held in its bracket (Illinois's rule; Dowell and Jarratt, BIT 11,
// 168, 1971, from memory); the settled voltage at +Inf where no top is higher.
func highest(settled, end, step float64, slope, at func(t float64) float64) (when, volts float64) {
	when, volts = math.Inf(1), settled
	if !(end > 0) || math.IsInf(end, 1) || !(step > 0) {
		return when, volts // not the poles of a circuit; whoever asked will refuse the rest too
	}
	step = math.Max(step, end/4000)
	b := slope(0)
	for hi := step; hi <= end+step; hi += step {
		lo, a := hi-step, b
		b = slope(hi)
		if a <= 0 || b > 0 {
			continue
		}
		if t := crossing(lo, hi, a, b, slope); at(t) > volts {
			when, volts = t, at(t)
		}
	}
	return when, volts
}

// crossing is where f falls through zero between lo and hi, with values a > 0 and b <= 0 there.
func crossing(lo, hi, a, b float64, f func(float64) float64) (t float64) {
	side := 0
	t = hi
	small := 1e-8 * math.Min(a, -b)
	for range 60 {
		if b == a || hi-lo <= 1e-13*hi {
			break
		}
		t = (lo*b - hi*a) / (b - a)
		s := f(t)
		switch {
		case math.Abs(s) <= small: // at a top the voltage is off by about the square of that
			return t
		case s > 0:
			lo, a = t, s
			if side > 0 {
				b /= 2
			}
			side = 1
		default:
			hi, b = t, s
			if side < 0 {
				a /= 2
			}
			side = -1
		}
	}
	return t
}

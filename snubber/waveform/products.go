package waveform

import "math/cmplx"

// products are the sums over all samples of one mode's e^(s t) with another's, times 1, t and t^2: both of e^((s + s') t),
// against of e^((s* + s') t), s the first index; and one of e^(s t) alone, times 1 and t.
type products struct {
	n             int // samples in a stretch
	both, against [maxModes][maxModes][3]complex128
	one           [maxModes][2]complex128
	inBoth        [maxModes][maxModes][3]complex128 // the same over one stretch, from j = 0
	inAgainst     [maxModes][maxModes][3]complex128
	inOne         [maxModes][2]complex128
}

// lay sums over a stretch of n samples, once.
func (p *products) lay(modes []mode, n int) {
	p.n = n
	for k, m := range modes {
		s := complex(-m.d, m.w)
		one := powers(s, n)
		p.inOne[k] = [2]complex128{one[0], one[1]}
		for l := range k + 1 {
			o := complex(-modes[l].d, modes[l].w)
			p.inBoth[k][l] = powers(s+o, n)
			p.inAgainst[k][l] = powers(cmplx.Conj(s)+o, n)
		}
	}
}

// powers is the sum over j from 0 to n-1 of e^(s j) times 1, j and j^2: of the first, the first two, four, ..., each the one before
// and the same again later, by the binary digits of n. The closed form of a geometric series cancels where s is small.
func powers(s complex128, n int) (out [3]complex128) {
	z := cmplx.Exp(s)
	sum := [3]complex128{1} // of the first length terms, of which z is e^(s length)
	turn, at := complex(1, 0), 0
	for length := 1; length <= n; length *= 2 {
		if n&length != 0 {
			later(&out, &sum, turn, complex(float64(at), 0))
			turn, at = turn*z, at+length
		}
		twice := sum
		later(&twice, &sum, z, complex(float64(length), 0))
		sum, z = twice, z*z
	}
	return out
}

// add takes in the stretch that begins at t.
func (p *products) add(modes []mode, t float64) {
	var turn [maxModes]complex128
	x := complex(t, 0)
	for k, m := range modes {
		turn[k] = m.power(t)
		p.one[k][0] += turn[k] * p.inOne[k][0]
		p.one[k][1] += turn[k] * (x*p.inOne[k][0] + p.inOne[k][1])
		for l := range k + 1 {
			later(&p.both[k][l], &p.inBoth[k][l], turn[k]*turn[l], x)
			later(&p.against[k][l], &p.inAgainst[k][l], cmplx.Conj(turn[k])*turn[l], x)
		}
	}
}

// later moves a stretch's sums to begin at t, and adds them.
func later(sum, in *[3]complex128, turn, t complex128) {
	sum[0] += turn * in[0]
	sum[1] += turn * (t*in[0] + in[1])
	sum[2] += turn * (t*t*in[0] + 2*t*in[1] + in[2])
}

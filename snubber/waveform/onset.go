package waveform

import (
	"math"
	"sort"
)

// prefix holds running sums of the samples, so that the mean over any block is one subtraction.
type prefix struct {
	v    []float64 // the samples
	ref  float64
	room *room
	sum  []float64 // sum[i]: the first i samples, less ref each
	tiny float64   // V: below this, differences are the rounding of the samples

	low, high float64 // V: of all samples
}

func newPrefix(v []float64) prefix {
	p := prefix{v: v, room: new(room), ref: v[len(v)-1], sum: make([]float64, len(v)+1)}
	p.low, p.high = extremes(v)
	p.tiny = 1e-9*p.spread() + 1e-14*math.Abs(p.ref)
	for i, x := range v {
		p.sum[i+1] = p.sum[i] + (x - p.ref)
	}
	return p
}

// spread is the highest sample less the lowest, V.
func (p prefix) spread() float64 { return p.high - p.low }

// extremes are the lowest and the highest of samples, V.
func extremes(v []float64) (low, high float64) {
	low, high = v[0], v[0]
	for _, x := range v {
		if x < low {
			low = x
		}
		if x > high {
			high = x
		}
	}
	return low, high
}

// mean of samples i to j-1, less ref.
func (p prefix) mean(i, j int) float64 { return (p.sum[j] - p.sum[i]) / float64(j-i) }

// blocks is the means of n blocks of m samples from i on, less ref. The mean over a block turns a damped oscillation into
// the same one, smaller; so what is slow is found in few numbers.
func (p prefix) blocks(i, m, n int) []float64 {
	out := make([]float64, n)
	for k := range out {
		out[k] = p.mean(i+k*m, i+(k+1)*m)
	}
	return out
}

// jump is how far the mean of the k samples from i on lies from the mean of the k before.
func (p prefix) jump(i, k int) float64 { return (p.sum[i+k] - 2*p.sum[i] + p.sum[i-k]) / float64(k) }

// samples i to j-1, to fit.
func (p prefix) samples(i, j int) series { return series{p.v[i:j], p.ref, p.room} }

// change is the size of the jump at i, V. At the shortest lengths it is at most 1.1 times that at twice the length, so that a glitch
// of a sample or two does not pose as an edge.
func (p prefix) change(i, k int) float64 {
	a := math.Abs(p.jump(i, k))
	if k <= 2 && i >= 2*k && i+2*k < len(p.sum) {
		a = min(a, 1.1*math.Abs(p.jump(i, 2*k)))
	}
	return a
}

// onset is where the voltage begins to move: near sample at, within some scale samples.
type onset struct {
	at, scale int
	size      float64 // V
}

// onsets finds the edges of a record, at most most, in time order; at least one, if only the largest change there is.
//
// It looks at the difference of the means over adjoining stretches, at the shortest length at which nearly the greatest
// difference shows, and takes each local extreme that is large, is no noise and stands well above what came shortly before. The
// swings of a ring shrink, so only its first one counts.
func (p prefix) onsets(most int) []onset {
	n := len(p.sum) - 1
	var tops []onset // one for each scale
	greatest := 0.0
	for k := 1; 2*k <= n && k <= max(1, n/4); k *= 2 {
		top := onset{scale: k, at: k}
		for i := k; i+k <= n; i += max(1, k/4) {
			if math.Abs(p.jump(i, k)) > top.size { // or the change is no greater either
				if a := p.change(i, k); a > top.size {
					top.at, top.size = i, a
				}
			}
		}
		tops = append(tops, top)
		greatest = max(greatest, top.size)
	}
	if greatest == 0 {
		return nil
	}
	var top onset
	for _, top = range tops {
		if top.size >= 0.7*greatest {
			break
		}
	}
	out := p.rising(top)
	sort.Slice(out, func(a, b int) bool { return out[a].size > out[b].size })
	out = out[:min(len(out), most)]
	sort.Slice(out, func(a, b int) bool { return out[a].at < out[b].at })
	return out
}

// rising takes the extremes at top's scale that stand well above what came before.
func (p prefix) rising(top onset) []onset {
	n, k := len(p.sum)-1, top.scale
	stride := max(1, k/4)
	last := (n - 2*k) / stride
	size := func(j int) float64 { return p.change(k+j*stride, k) }
	const back, near = 40, 6 // strides: ten and one and a half times a long scale
	long, short := back, near
	if k < 4 {
		long, short = 10*k, 1+k
	}
	noise := quietest(p.v)
	var out []onset
	var before peaks
	var fresh []int // extremes less than short before
	var left, here float64
	right := size(0)
	for j := range last + 1 {
		left, here, right = here, right, 0
		if j < last {
			right = size(j + 1)
		}
		for len(fresh) > 0 && fresh[0] <= j-short {
			before.push(fresh[0], size(fresh[0]))
			fresh = append(fresh[:0], fresh[1:]...)
		}
		before.forget(j - long)
		if here < left || here <= right {
			continue
		}
		fresh = append(fresh, j)
		if here >= 0.2*top.size && here > 1.4*before.top() && p.isChange(k+j*stride, k, noise) {
			out = append(out, onset{at: k + j*stride, scale: k, size: here})
		}
	}
	if len(out) == 0 {
		out = append(out, top)
	}
	return out
}

// isChange says whether the jump at i is more than noise: six standard deviations of it, at length k or one up to 8 times as long.
func (p prefix) isChange(i, k int, noise float64) bool {
	for long := k; long <= 8*k && i >= long && i+long < len(p.sum); long *= 2 {
		if math.Abs(p.jump(i, long)) > 6*math.Sqrt(2/float64(long))*noise {
			return true
		}
	}
	return false
}

// peaks keeps the greatest of the last values.
type peaks struct {
	at    []int
	value []float64
}

func (q *peaks) push(at int, v float64) {
	for n := len(q.value); n > 0 && q.value[n-1] <= v; n = len(q.value) {
		q.at, q.value = q.at[:n-1], q.value[:n-1]
	}
	q.at, q.value = append(q.at, at), append(q.value, v)
}

// forget those up to the given one.
func (q *peaks) forget(at int) {
	for len(q.at) > 0 && q.at[0] <= at {
		q.at, q.value = append(q.at[:0], q.at[1:]...), append(q.value[:0], q.value[1:]...)
	}
}

func (q *peaks) top() float64 {
	if len(q.value) == 0 {
		return 0
	}
	return q.value[0]
}

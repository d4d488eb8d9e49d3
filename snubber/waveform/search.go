package waveform

import (
	"math"
	"sort"
)

// tone is a mode that turns, found in samples from some instant on, and how much of them it explains.
type tone struct {
	mode           // per sample of the record
	energy float64 // V^2, summed over the record's samples
}

const (
	pencilSamples = 64
	pencilModes   = 6 // two tones, a level, an exponential
)

// tones looks for oscillations after sample from and before to at every octave: in block means of 1, 2, 4, ... samples, 64
// of them, by the pencil. A ring of 8 samples a cycle at one octave has 16 at the next lower, so each is seen where it is
// best resolved, and a record of any length costs a few short pencils. The first quarter of a cycle is left out: the edge's own.
// Strongest first.
func (p prefix) tones(from, to int) []tone {
	var found []tone
	for m := 1; m <= max(1, (to-from)/16); m *= 4 {
		begin := from + 2*m
		if m == 1 {
			begin = from + 1
		}
		n := min(pencilSamples, (to-begin)/m)
		if n < 12 {
			break
		}
		y := p.blocks(begin, m, n)
		for _, t := range strongest(series{y, 0, p.room}, pencil(y, pencilModes), m) {
			found = append(found, tone{mode{t.d / float64(m), t.w / float64(m)}, t.energy * float64(m)})
		}
	}
	sort.SliceStable(found, func(a, b int) bool { return found[a].energy > found[b].energy })
	var out []tone
	for _, t := range found {
		if !nearOne(out, t.w, 0.2) {
			out = append(out, t)
		}
	}
	return out
}

// nearOne says whether a tone within the given share of w is there already.
func nearOne(ts []tone, w, share float64) bool {
	for _, t := range ts {
		if math.Abs(t.w-w) < share*w {
			return true
		}
	}
	return false
}

// strongest weighs each tone among the modes by the energy the samples lose with it, beside the level and the plain
// exponentials.
func strongest(in series, modes []mode, m int) []tone {
	var plain []mode
	var out []tone
	lowest, highest := 2*math.Pi*0.02, 2*math.Pi*0.3
	if m == 1 {
		highest = 2 * math.Pi * 0.49
	}
	for _, x := range modes {
		if x.w == 0 && x.d > 0.5/float64(len(in.y)) && len(plain) == 0 {
			plain = append(plain, x)
		}
	}
	without, ok := held(in, plain)
	if !ok {
		plain = nil
		if without, ok = held(in, plain); !ok {
			return nil
		}
	}
	for _, x := range modes {
		if x.w < lowest || x.w > highest || x.d > 1.2*x.w || x.d < -0.05*x.w || !plausible(x, len(in.y)) {
			continue
		}
		x.d = max(x.d, 0.1/float64(len(in.y)))
		if with, ok := held(in, append([]mode{x}, plain...)); ok {
			out = append(out, tone{x, without.rss - with.rss})
		}
	}
	return out
}

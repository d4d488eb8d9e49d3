package waveform

import (
	"math"
	"sort"
)

// convertersStep is the step between the levels the samples lie on, V, where they lie on few enough levels to see it; 0
// where they do not. A look at some thousand samples tells.
func convertersStep(v []float64) float64 {
	const look = 4096
	stride := max(1, len(v)/look)
	seen := make([]float64, 0, look+1)
	for i := 0; i < len(v); i += stride {
		seen = append(seen, v[i])
	}
	sort.Float64s(seen)
	span := max(math.Abs(seen[0]), math.Abs(seen[len(seen)-1]))
	eps := 1e-12 * span
	levels, step := 1, math.Inf(1)
	for i := 1; i < len(seen); i++ {
		if d := seen[i] - seen[i-1]; d > eps {
			levels++
			step = min(step, d)
		}
	}
	if levels < 2 || levels > len(seen)/3 && levels > 16 || (seen[len(seen)-1]-seen[0])/step > 70000 {
		return 0
	}
	// The least gap may itself be short by rounding of the printed samples: the mean over all gaps is better.
	total, steps := 0.0, 0.0
	for i := 1; i < len(seen); i++ {
		d := seen[i] - seen[i-1]
		if d <= eps {
			continue
		}
		k := math.Round(d / step)
		if math.Abs(d/step-k) > 0.1*min(k, 2) {
			return 0
		}
		total += d
		steps += k
	}
	return total / steps
}

// quickNoise is the noise's standard deviation by second differences, V: right where samples are many to a cycle, too
// large where they are few. It is the median's, so a few edges do not matter.
func quickNoise(v []float64) float64 { return noiseAt(v, 1024) }

// noiseAt looks at that many samples, or few more.
func noiseAt(v []float64, look int) float64 {
	stride := max(1, len(v)/look)
	var size []float64
	for i := 1; i+1 < len(v); i += stride {
		size = append(size, math.Abs(v[i-1]-2*v[i]+v[i+1]))
	}
	if len(size) == 0 {
		return 0
	}
	sort.Float64s(size)
	return size[len(size)/2] / (0.6745 * math.Sqrt(6))
}

// quietest is the noise, V, in that quarter of the samples where it is least: where nothing rings, or the ring has died down.
func quietest(v []float64) float64 {
	part := max(len(v)/4, min(len(v), 64))
	least := math.Inf(1)
	for i := 0; i+part <= len(v); i += part {
		least = min(least, noiseAt(v[i:i+part], 256))
	}
	return least
}

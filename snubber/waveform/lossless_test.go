package waveform

import (
	"bytes"
	"compress/flate"
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// quantised is a ring as a converter of so many bits gives it, with its noise of a step or so.
func quantised(n, bits int, noise float64, seed uint64) []float64 {
	random := rand.New(rand.NewPCG(5, seed))
	step := 100 / math.Pow(2, float64(bits))
	volts := make([]float64, n)
	for i := range volts {
		t := float64(i) - float64(n)/10
		v := 48.0
		if t < 0 {
			v = 0
		} else {
			v *= 1 - math.Exp(-t/(float64(n)/12))*math.Cos(2*math.Pi*t/40)
		}
		code := math.Round((v+noise*step*random.NormFloat64()+2.3)/step - math.Pow(2, float64(bits-1)))
		volts[i] = (code+7)*step - 1.7 // in an instrument's own arithmetic
	}
	return volts
}

func gauss(n int, seed uint64) []float64 {
	random := rand.New(rand.NewPCG(5, seed))
	volts := make([]float64, n)
	for i := range volts {
		volts[i] = random.NormFloat64()
	}
	return volts
}

func roundTrip(t testing.TB, name string, volts []float64) (size int, encoding string) {
	t.Helper()
	kept := append([]float64(nil), volts...)
	data, encoding, err := Pack(volts)
	if err != nil {
		t.Fatalf("%s: %v", name, err)
	}
	back, err := Unpack(data, encoding)
	if err != nil {
		t.Fatalf("%s: %v", name, err)
	}
	if len(back) != len(volts) {
		t.Fatalf("%s: %d samples of %d", name, len(back), len(volts))
	}
	for i, v := range kept {
		if math.Float64bits(back[i]) != math.Float64bits(v) || math.Float64bits(volts[i]) != math.Float64bits(v) {
			t.Fatalf("%s: sample %d, %g, comes back as %g", name, i, v, back[i])
		}
	}
	return len(data), encoding
}

func TestPackRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 20))
	bits := make([]float64, 5000)
	for i := range bits {
		for bits[i] = math.NaN(); math.IsNaN(bits[i]) || math.IsInf(bits[i], 0); {
			bits[i] = math.Float64frombits(random.Uint64())
		}
	}
	few := make([]float64, 3000)
	for i := range few {
		few[i] = []float64{0, math.Copysign(0, -1), 5e-324, -5e-324, math.MaxFloat64, -math.MaxFloat64, 1, math.Nextafter(1, 2)}[random.IntN(8)]
	}
	for name, c := range map[string]struct {
		volts    []float64
		encoding string
		most     float64 // bits per sample
	}{
		"none":               {nil, LevelsEncoding, 0},
		"one":                {[]float64{3.3}, LevelsEncoding, 400},
		"-0":                 {[]float64{math.Copysign(0, -1)}, LevelsEncoding, 400},
		"a constant":         {make([]float64, 100_000), LevelsEncoding, 0.02},
		"any bits":           {bits, PlanesEncoding, 65},
		"extremes":           {few, LevelsEncoding, 4},
		"8 bits":             {quantised(10_000, 8, 0.3, 21), LevelsEncoding, 3},
		"10 bits":            {quantised(10_000, 10, 1, 22), LevelsEncoding, 4.5},
		"12 bits":            {quantised(100_000, 12, 3, 23), LevelsEncoding, 6},
		"16 bits":            {quantised(300_000, 16, 5, 24), LevelsEncoding, 8},
		"noise":              {gauss(10_000, 25), PlanesEncoding, 60},
		"256 levels exactly": {count(256, 2000), LevelsEncoding, 4},
		"257 levels":         {count(257, 2000), LevelsEncoding, 4},
		"65536 levels":       {count(65536, 300_000), LevelsEncoding, 4},
		"65537 levels":       {count(65537, 300_000), PlanesEncoding, 64},
	} {
		size, encoding := roundTrip(t, name, c.volts)
		if encoding != c.encoding {
			t.Errorf("%s: %s", name, encoding)
		}
		if per := 8 * float64(size) / float64(len(c.volts)); len(c.volts) > 0 && per > c.most {
			t.Errorf("%s: %.2f bits per sample, %d bytes", name, per, size)
		}
	}
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		if _, _, err := Pack([]float64{1, bad}); err == nil || !strings.Contains(err.Error(), "sample 2 of 2") {
			t.Errorf("%g: %v", bad, err)
		}
	}
}

// count goes through n levels again and again.
func count(levels, n int) []float64 {
	volts := make([]float64, n)
	for i := range volts {
		volts[i] = float64(i%levels)*0.1 - 3
	}
	return volts
}

// Every bit of packed samples that is turned over, and every cut, is noticed.
func TestUnpackDamaged(t *testing.T) {
	for _, volts := range [][]float64{quantised(600, 8, 0.3, 31), quantised(3000, 12, 1, 32), gauss(60, 33), nil} {
		data, encoding, err := Pack(volts)
		if err != nil {
			t.Fatal(err)
		}
		for i := range data {
			if _, err := Unpack(data[:i], encoding); err == nil {
				t.Errorf("%s cut to %d of %d bytes: no error", encoding, i, len(data))
			}
			for bit := range 8 {
				bad := bytes.Clone(data)
				bad[i] ^= 1 << bit
				got, err := Unpack(bad, encoding)
				if err == nil && checksum(got) != checksum(volts) {
					t.Errorf("%s, byte %d of %d, bit %d: no error", encoding, i, len(data), bit)
				}
			}
		}
		for _, name := range []string{"", "gzip", PlanesEncoding, LevelsEncoding} {
			if _, err := Unpack(data, name); err == nil && name != encoding {
				t.Errorf("%s as %q: no error", encoding, name)
			}
		}
	}
}

// A few bytes that claim many samples take no memory for them.
func TestUnpackClaims(t *testing.T) {
	for encoding, form := range map[string]byte{LevelsEncoding: levelsForm, PlanesEncoding: planesForm} {
		for _, claim := range []uint64{1 << 62, MaxSamples + 1, MaxSamples, 100_000} {
			data := append([]byte(packMark), form)
			data = append(binary.AppendUvarint(data, claim), "0000and the rest"...)
			if _, err := Unpack(data, encoding); err == nil || !strings.Contains(err.Error(), "which so few bytes cannot") {
				t.Errorf("%s, %d samples: %v", encoding, claim, err)
			}
		}
	}
}

func FuzzUnpack(f *testing.F) {
	for _, volts := range [][]float64{nil, {1, 2, 3}, quantised(300, 8, 0.3, 41), count(300, 2000), gauss(30, 42)} {
		data, encoding, err := Pack(volts)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(data, encoding == LevelsEncoding)
	}
	f.Add([]byte(packMark+"\x00\xff\xff\xff\xff\x0f0000"), false)
	f.Fuzz(func(t *testing.T, data []byte, levels bool) {
		encoding := PlanesEncoding
		if levels {
			encoding = LevelsEncoding
		}
		volts, err := Unpack(data, encoding)
		if err != nil {
			return
		}
		for _, v := range volts {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return // never packed, and not refused by Unpack: Record.Check does
			}
		}
		roundTrip(t, "what was unpacked", volts)
	})
}

func FuzzPack(f *testing.F) {
	f.Add([]byte("0123456789abcdef"), uint8(1))
	f.Fuzz(func(t *testing.T, raw []byte, wide uint8) {
		var volts []float64
		for len(raw) >= 8 {
			bits := uint64(0)
			for _, b := range raw[:8] {
				bits = bits<<8 | uint64(b)
			}
			if v := math.Float64frombits(bits); !math.IsNaN(v) && !math.IsInf(v, 0) {
				volts = append(volts, v)
			}
			raw = raw[1+wide%8:]
		}
		roundTrip(t, "bits", volts)
	})
}

// Sizes and rates beside deflate on the samples' bytes as they stand, at its usual level, in the same run.
func BenchmarkPack(b *testing.B) {
	for _, c := range []struct {
		name  string
		volts []float64
	}{
		{"ring-8-bit-10k", quantised(10_000, 8, 0.3, 51)},
		{"ring-12-bit-10k", quantised(10_000, 12, 1, 52)},
		{"noise-10k", gauss(10_000, 53)},
		{"ring-8-bit-10M", quantised(10_000_000, 8, 0.3, 54)},
		{"noise-10M", gauss(10_000_000, 55)},
	} {
		raw := make([]byte, 0, 8*len(c.volts))
		for _, v := range c.volts {
			for s := 0; s < 64; s += 8 {
				raw = append(raw, byte(math.Float64bits(v)>>s))
			}
		}
		data, encoding, err := Pack(c.volts)
		if err != nil {
			b.Fatal(err)
		}
		run := func(name string, work func() int) {
			b.Run(fmt.Sprintf("%s/%s", c.name, name), func(b *testing.B) {
				b.ReportAllocs()
				b.SetBytes(int64(len(raw)))
				size := 0
				for b.Loop() {
					size = work()
				}
				b.ReportMetric(float64(size), "bytes-packed")
			})
		}
		run("pack", func() int {
			data, _, err := Pack(c.volts)
			if err != nil {
				b.Fatal(err)
			}
			return len(data)
		})
		run("unpack", func() int {
			if _, err := Unpack(data, encoding); err != nil {
				b.Fatal(err)
			}
			return len(data)
		})
		var plain bytes.Buffer
		run("deflate", func() int {
			plain.Reset()
			z, err := flate.NewWriter(&plain, flate.DefaultCompression)
			if err != nil {
				b.Fatal(err)
			}
			if _, err := z.Write(raw); err != nil {
				b.Fatal(err)
			}
			if err := z.Close(); err != nil {
				b.Fatal(err)
			}
			return plain.Len()
		})
		run("inflate", func() int {
			if _, err := io.Copy(io.Discard, flate.NewReader(bytes.NewReader(plain.Bytes()))); err != nil {
				b.Fatal(err)
			}
			return plain.Len()
		})
	}
}

package acquire

import (
	"math"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"ringbook/acquire/scpi"
)

var formats = []Format{Int8, Uint8, Int16, Uint16, Float32, ASCII}

// Whatever an instrument sends: finite volts, as many as there are samples in it, the same in whatever pieces they
// come; or an error and a cure, never a panic.
func FuzzDecode(f *testing.F) {
	for i := range formats {
		f.Add([]byte("\x01\x80\xff\x00"), uint8(i), false, 4.0, 0.5, 1.0, false)
		f.Add([]byte("\x7f\x80\x00\x00"), uint8(i), true, math.NaN(), 1e300, 1e300, false)
		f.Add([]byte("1,-2.5E+3,.5,\n"), uint8(i), false, 3.0, -0.5, -1.0, true)
		f.Add([]byte(""), uint8(i), true, 0.0, 0.0, 0.0, true)
	}
	f.Fuzz(func(t *testing.T, data []byte, which uint8, little bool, points, perCode, zero float64, endless bool) {
		format := formats[int(which)%len(formats)]
		order := Big
		if little {
			order = Little
		}
		run := func(piece bool) (*decoder, error) {
			d := &decoder{format: format, order: order, calibration: calibration{points: points, voltPerCode: perCode, zeroV: zero, scale: 1}}
			body, size := strings.NewReader(string(data)), int64(len(data))
			if endless {
				size = -1
			}
			if piece {
				return d, d.decode(iotest.HalfReader(body), size)
			}
			return d, d.decode(body, size)
		}
		d, err := run(false)
		again, err2 := run(true)
		if (err == nil) != (err2 == nil) || err != nil && err.Error() != err2.Error() || err == nil && !slices.Equal(d.volts, again.volts) {
			t.Fatalf("at once %v, %v; in pieces %v, %v", d.volts, err, again.volts, err2)
		}
		if err != nil {
			if unfit, ok := err.(*sampleError); !ok || unfit.cure == "" || unfit.problem == "" {
				t.Fatalf("%#v has no cure", err)
			}
			return
		}
		if len(d.volts) == 0 || slices.ContainsFunc(d.volts, beyond) {
			t.Fatalf("taken for samples: %v", d.volts)
		}
		if w := format.width(); w > 0 && len(d.volts)*w != len(data) {
			t.Fatalf("%d samples of %d bytes", len(d.volts), len(data))
		}
		if !math.IsNaN(points) && float64(len(d.volts)) != points {
			t.Fatalf("%d samples, promised %g", len(d.volts), points)
		}
		if step := d.codesPerStep(); !(step >= 1 && step <= 1<<15) {
			t.Fatalf("%g codes a step", step)
		}
	})
}

// A preamble gives every named field a number that can be, or an error.
func FuzzPreamble(f *testing.F) {
	for _, s := range []string{"4,0,1E-9,-1,2,3,.5", `4;"a;b,""c";1;2;3;4;5`, "", ",", "9.91E37,1,2,3,4,5,6", "'", "4,0,0,0,0,0,0", "4.5"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, reply string) {
		names := append([]string{points}, scalings()...)
		values := map[string]float64{}
		if err := readPreamble(reply, names, values); err != nil {
			return
		}
		for _, name := range names {
			if v, ok := values[name]; !ok || checkScaler(name, v) != nil || name == points && !(v >= 1) {
				t.Fatalf("%q: %s = %g, %t", reply, name, v, ok)
			}
		}
	})
}

func TestSplitFields(t *testing.T) {
	for reply, want := range map[string][]string{
		"1,2": {"1", "2"}, "1; 2 ,3": {"1", "2", "3"}, `1,"a,b;c",'x;"y',2`: {"1", `"a,b;c"`, `'x;"y'`, "2"}, `"a"",b",2`: {`"a"",b"`, "2"}, "": {""}, `1,"open,2`: {"1", `"open,2`},
	} {
		if got := splitFields(reply); !slices.Equal(got, want) {
			t.Errorf("%q: %q, want %q", reply, got, want)
		}
	}
}

// More samples than room is made for at once.
func TestDecodeGrows(t *testing.T) {
	if testing.Short() {
		t.Skip("it takes a quarter of a gigabyte")
	}
	const n = 1<<24 + 100_002
	d := &decoder{format: Uint8, calibration: calibration{points: math.NaN(), voltPerCode: 0.5, scale: 1}}
	if err := d.decode(strings.NewReader(""), 0); err == nil {
		t.Error("an empty block")
	}
	if err := d.decode(strings.NewReader(strings.Repeat("\x00\x02\x04", n/3)+"\x06"), n); err != nil || len(d.volts) != n || d.volts[n-1] != 3 || d.volts[n-2] != 2 || d.volts[1] != 1 {
		t.Fatalf("%d samples, %v", len(d.volts), err)
	}
}

// A trace with a hole in it is told with the word for it.
func TestNoReadingStaysOne(t *testing.T) {
	if _, err := readScaler("start_s", "+9.91E+37"); err == nil || !strings.Contains(err.Error(), scpi.ErrNoReading.Error()) {
		t.Errorf("%v", err)
	}
}

package leastsq

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
)

// Data and results: JCGM 100:2008, H.2 (resistance and reactance measured together); the digits beyond those
// printed there are recomputed with 25 digits and more.
func TestPropagateGUMH2(t *testing.T) {
	data := [][]float64{
		{5.007, 4.994, 5.005, 4.990, 4.999},
		{19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3},
		{1.0456, 1.0438, 1.0468, 1.0428, 1.0433},
	}
	n := len(data[0])
	mean := make([]float64, 3)
	cov := mat.NewSymDense(3, nil) // of the means
	for i := range data {
		mean[i] = stat.Mean(data[i], nil)
		for j := i; j < 3; j++ {
			cov.SetSym(i, j, stat.Covariance(data[i], data[j], nil)/float64(n))
		}
	}
	v, i, phi := mean[0], mean[1], mean[2]
	s, c := math.Sincos(phi)
	z := v / i
	r, x := z*c, z*s
	out := Propagate(cov, mat.NewDense(3, 3, []float64{
		c / i, -r / i, -x,
		s / i, -x / i, r,
		1 / i, -z / i, 0,
	}))
	u := func(c *mat.SymDense, i int) float64 { return math.Sqrt(c.At(i, i)) }
	rho := func(c *mat.SymDense, i, j int) float64 { return c.At(i, j) / u(c, i) / u(c, j) }
	for _, q := range []struct {
		name      string
		got, want float64
	}{
		{"u(V)", u(cov, 0), 0.00320936130717624},
		{"u(I)", u(cov, 1), 9.47100839404126e-6},
		{"u(phi)", u(cov, 2), 0.000752063827078527},
		{"r(V,I)", rho(cov, 0, 1), -0.355311219817511},
		{"r(V,phi)", rho(cov, 0, 2), 0.857624210839954},
		{"r(I,phi)", rho(cov, 1, 2), -0.645111217689245},
		{"R", r, 127.732169928102},
		{"u(R)", u(out, 0), 0.0710714073969959},
		{"X", x, 219.846511912638},
		{"u(X)", u(out, 1), 0.295581677358644},
		{"Z", z, 254.259701948019},
		{"u(Z)", u(out, 2), 0.23633613008238},
		{"r(R,X)", rho(out, 0, 1), -0.588429784423456},
		{"r(R,Z)", rho(out, 0, 2), -0.485259224209857},
		{"r(X,Z)", rho(out, 1, 2), 0.992511648949016},
	} {
		if d := digits(q.got, q.want); !(d >= 9) {
			t.Errorf("%s = %.12g, want %.12g (%.1f digits)", q.name, q.got, q.want, d)
		}
	}
}

func TestPropagateUnknown(t *testing.T) {
	inf := math.Inf(1)
	cov := mat.NewSymDense(3, []float64{4, 1, 0, 1, 9, 0, 0, 0, inf})
	out := Propagate(cov, mat.NewDense(3, 3, []float64{
		1, 1, 0,
		2, 0, 0,
		1, 0, -1,
	}))
	want := mat.NewSymDense(3, []float64{15, 10, 0, 10, 16, 0, 0, 0, inf})
	if !mat.Equal(out, want) {
		t.Errorf("got %v, want %v", mat.Formatted(out), mat.Formatted(want))
	}
	defer func() {
		if recover() != mat.ErrShape {
			t.Error("shapes that do not fit: no mat.ErrShape")
		}
	}()
	Propagate(cov, mat.NewDense(1, 2, nil))
}

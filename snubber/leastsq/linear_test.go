package leastsq

import (
	"math"
	"math/big"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// polynomial gives the design 1, x, x^2, ... with every power rounded once, not at each multiplication.
func polynomial(x []float64, degree int) *mat.Dense {
	d := mat.NewDense(len(x), degree+1, nil)
	for i, v := range x {
		power := big.NewFloat(1).SetPrec(1000)
		for k := range degree + 1 {
			f, _ := power.Float64()
			d.Set(i, k, f)
			power.Mul(power, new(big.Float).SetPrec(1000).SetFloat64(v))
		}
	}
	return d
}

// columns gives a design of the columns, after one of ones if intercept.
func columns(intercept bool, x [][]float64) *mat.Dense {
	if intercept {
		ones := make([]float64, len(x[0]))
		for i := range ones {
			ones[i] = 1
		}
		x = append([][]float64{ones}, x...)
	}
	d := mat.NewDense(len(x[0]), len(x), nil)
	for j := range x {
		d.SetCol(j, x[j])
	}
	return d
}

func TestLinearStRD(t *testing.T) {
	certificates, sums := readCertified(t), readSums(t)
	for _, set := range []struct {
		name   string
		design func(x [][]float64) *mat.Dense
		dof    int
	}{
		{"Norris", func(x [][]float64) *mat.Dense { return columns(true, x) }, 34},
		{"Pontius", func(x [][]float64) *mat.Dense { return polynomial(x[0], 2) }, 37},
		{"NoInt1", func(x [][]float64) *mat.Dense { return columns(false, x) }, 10},
		{"NoInt2", func(x [][]float64) *mat.Dense { return columns(false, x) }, 2},
		{"Longley", func(x [][]float64) *mat.Dense { return columns(true, x) }, 9},
		{"Wampler1", func(x [][]float64) *mat.Dense { return polynomial(x[0], 5) }, 15},
		{"Wampler4", func(x [][]float64) *mat.Dense { return polynomial(x[0], 5) }, 15},
		{"Filip", func(x [][]float64) *mat.Dense { return polynomial(x[0], 10) }, 71},
	} {
		t.Run(set.name, func(t *testing.T) {
			y, x := readSet(t, set.name)
			res, err := Linear(set.design(x), y, nil)
			if err != nil {
				t.Fatal(err)
			}
			want := certificates[set.name]
			value, sd := agreement(res.P, want.value), agreement(res.StdErr(Scatter), want.sd)
			sum := digits(res.Chi2, sums[set.name])
			t.Logf("digits: values %.1f, sd %.1f, sum of squares %.1f; %d solutions, condition %.1e",
				value, sd, sum, res.Iterations, res.Condition)
			if res.Status != Converged || res.Dof != set.dof {
				t.Errorf("status %v (%s), dof %d, want %d", res.Status, res.Reason, res.Dof, set.dof)
			}
			least := 13.
			if set.name == "Filip" {
				least = 7 // the powers of x, rounded to a float64 each, hold no more
			}
			if !(value >= least) {
				t.Errorf("values %v, certified %v", res.P, want.value)
			}
			if !(sd >= min(least, 12)) {
				t.Errorf("standard deviations %v, certified %v", res.StdErr(Scatter), want.sd)
			}
			if !(sum >= 9) {
				t.Errorf("sum of squares %v, certified %v", res.Chi2, sums[set.name])
			}
		})
	}
}

// Every figure: JCGM 100:2008, H.3 (calibration of a thermometer); the digits beyond those printed there are
// recomputed with 25 digits and more.
func TestLinearGUMH3(t *testing.T) {
	temp := []float64{21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511}
	b := []float64{-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160}
	x := mat.NewDense(len(temp), 2, nil)
	for i, v := range temp {
		x.SetRow(i, []float64{1, v - 20})
	}
	res, err := Linear(x, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	u := res.StdErr(Scatter)
	at30 := mat.NewDense(1, 2, []float64{1, 10})
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"y1", res.P[0], -0.17120379013135},
		{"s(y1)", u[0], 0.00287759783515995},
		{"y2", res.P[1], 0.00218269773988728},
		{"s(y2)", u[1], 0.000667938773227832},
		{"r(y1,y2)", res.Correlation().At(0, 1), -0.930429603093446},
		{"s", math.Sqrt(res.Chi2 / float64(res.Dof)), 0.00349756396350528},
		{"b(30)", res.P[0] + 10*res.P[1], -0.149376812732477},
		{"u(b(30))", math.Sqrt(Propagate(res.Covariance(Scatter), at30).At(0, 0)), 0.00413859575285495},
		{"residual 1", -res.Residuals[0], -0.00311609313101857},
	} {
		if d := digits(c.got, c.want); !(d >= 11) {
			t.Errorf("%s = %.15g, want %.15g (%.1f digits)", c.name, c.got, c.want, d)
		}
	}
}

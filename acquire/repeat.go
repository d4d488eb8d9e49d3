package acquire

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"ringbook/acquire/scpi"
)

// falseAlarm is the share of rounds in which repeats that are normally distributed have one asked once more.
const falseAlarm = 0.01

// repeated is what the repeats of one quantity gave.
type repeated struct {
	values  []float64 // in the order read
	asked   int
	outlier int // which of the values lies off, and was asked once more; -1: none
}

// repeat asks as often as q says, and once more where one of the values lies further off than the others allow.
func (in *instrument) repeat(ctx context.Context, q Query, progress func(Progress)) (repeated, error) {
	r := repeated{outlier: -1}
	if err := in.ready(ctx); err != nil {
		return r, err
	}
	ask := func(of int) error {
		v, _, err := in.once(ctx, q)
		if err != nil && !errors.Is(err, scpi.ErrNoReading) {
			return err
		}
		r.asked++
		if err == nil {
			r.values = append(r.values, v)
		}
		if progress != nil {
			progress(Progress{q.Quantity, in.Name, r.asked, of, v})
		}
		return nil
	}
	for range q.repeats() {
		if err := ask(q.repeats()); err != nil {
			return r, err
		}
	}
	if r.outlier = outlier(r.values, q.Accuracy); r.outlier < 0 {
		return r, nil
	}
	return r, ask(r.asked + 1)
}

// warning says what lies off, and what it was when it was asked again.
func (r repeated) warning(q Query, instrument string) string {
	if r.outlier < 0 {
		return ""
	}
	text := fmt.Sprintf("%s: repeat %d, %.6g, lies further off than the spread of the others allows; %s was asked once more and ", q.Quantity, r.outlier+1, r.values[r.outlier], instrument)
	if len(r.values) <= q.repeats() && r.asked > q.repeats() && len(r.values) < r.asked {
		return text + "gave no reading; all repeats are kept in the mean"
	}
	return text + fmt.Sprintf("gave %.6g; both are kept in the mean", r.values[len(r.values)-1])
}

// outlier gives the index of the value that lies furthest from the others, where that is further than they allow;
// -1: none does. For the value x, and the mean m and the standard deviation s of the n - 1 others, it is
//
//	|x - m| > t s sqrt(1 + 1/(n - 1)),   t the quantile 1 - 0.01/(2 n) of Student's t, n - 2 degrees of freedom
//
// which is Grubbs's test of one outlier, two-sided (F. E. Grubbs, Procedures for detecting outlying observations in
// samples, Technometrics 11, 1969) [from memory], written with the others' figures: of rounds whose repeats are normally
// distributed it finds an outlier in 1 %. Two outliers may hide each other. What lies within the instrument's stated
// accuracy is no outlier; and where none is stated and the others do not differ at all, their spread says nothing: it is
// the last digit's.
func outlier(values []float64, accuracy Accuracy) int {
	n := len(values)
	if n < 3 {
		return -1
	}
	all, _ := Query{}.evaluate(values)
	far := 0
	for i, v := range values {
		if math.Abs(v-all) > math.Abs(values[far]-all) {
			far = i
		}
	}
	others := append(append([]float64{}, values[:far]...), values[far+1:]...)
	mean, u := Query{}.evaluate(others) // u is s/sqrt(n - 1)
	off := math.Abs(values[far] - mean)
	bound := accuracy.Bound(mean)
	t := distuv.StudentsT{Sigma: 1, Nu: float64(n - 2)}.Quantile(1 - falseAlarm/float64(2*n))
	if u == 0 && bound == 0 || off <= bound || off <= t*u*math.Sqrt(float64(n)) {
		return -1
	}
	return far
}

package snubber

import (
	"context"
	"math"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/stat/distuv"
)

// together is the fit of several revisions with the parts they share. Its parameters are those of one revision after the
// other; its nuisances are the capacitors of all and then the resistors.
type together struct {
	outs  []*outcome // each revision's own
	scale []float64  // by how much each widens its uncertainties

	of    [][noParts][]int        // for each revision, which of the parts of all each of its own is
	parts [noParts][]physicalPart // of all revisions

	models []*model // the revisions' own, with the parts of all
	first  []int    // where each one's parameters start
	params int
	blocks []revisionTrial

	fit *leastsq.PartitionedResult
}

// anonymous is the name of a part of a trial that names neither part nor session (see observe).
const anonymous = "session "

const (
	capacitors = iota
	resistors
	noParts
)

// revisionTrial is a trial kept in a revision's own fit.
type revisionTrial struct {
	revision int
	*observed
}

// own gives the parts of an observation by kind; -1: none.
func (x *observed) own() [noParts]int { return [noParts]int{x.c, x.r} }

func (o *observations) parts() [noParts][]physicalPart {
	return [noParts][]physicalPart{o.caps, o.ohms}
}

// newTogether finds the parts that the revisions share; where common is false they share none.
func newTogether(fits []*FitResult, common bool) *together {
	t := &together{}
	type commonKey struct {
		kind, revision int // revision: counted from one where the part is known in that one alone
		partKey
	}
	index := map[commonKey]int{}
	for k, f := range fits {
		t.outs = append(t.outs, f.state)
		t.scale = append(t.scale, f.state.scatter())
		var of [noParts][]int
		for kind, parts := range f.state.model.obs.parts() {
			for _, p := range parts {
				key := commonKey{kind: kind, partKey: p.key}
				if !common || p.key.name == anonymous {
					key.revision = k + 1
				}
				i, ok := index[key]
				if !ok {
					i = len(t.parts[kind])
					index[key] = i
					p.u = 0
					t.parts[kind] = append(t.parts[kind], p)
				}
				of[kind] = append(of[kind], i)
			}
		}
		t.of = append(t.of, of)
	}
	return t
}

// build makes the models of the revisions with the parts of all, with all uncertainties of a revision widened as its own
// fit has them. A part that served on several is as uncertain as on the worst of them.
func (t *together) build() {
	t.models, t.first, t.blocks, t.params = nil, nil, nil, 0
	for kind := range t.parts {
		for i := range t.parts[kind] {
			t.parts[kind][i].u = 0
		}
	}
	for k, out := range t.outs {
		for kind, parts := range out.model.obs.parts() {
			for j, p := range parts {
				all := &t.parts[kind][t.of[k][kind][j]]
				all.u = math.Max(all.u, p.u*t.scale[k])
			}
		}
	}
	for k, out := range t.outs {
		obs, m := *out.model.obs, *out.model
		obs.list = append([]observed{}, obs.list...)
		obs.caps, obs.ohms = t.parts[capacitors], t.parts[resistors]
		m.obs = &obs
		for _, i := range out.kept {
			x := &obs.list[i]
			if x.c >= 0 {
				x.c = t.of[k][capacitors][x.c]
			}
			if x.r >= 0 {
				x.r = t.of[k][resistors][x.r]
			}
			for q := range x.u {
				x.u[q] *= t.scale[k]
			}
			t.blocks = append(t.blocks, revisionTrial{k, x})
		}
		t.models = append(t.models, &m)
		t.first = append(t.first, t.params)
		t.params += m.params
	}
}

// run fits all revisions, from where the last fit ended or from the revisions' own.
func (t *together) run(ctx context.Context) error {
	t.build()
	var start []float64
	for _, out := range t.outs {
		start = append(start, out.fit.P...)
	}
	if t.fit != nil {
		start = t.fit.P
	}
	var own leastsq.Block
	fit, err := leastsq.FitPartitioned(ctx, leastsq.Partitioned{
		Shared: t.params, First: len(t.parts[capacitors]), Second: len(t.parts[resistors]), Blocks: len(t.blocks), Start: start,
		Eval: func(i int, p, d []float64, derivatives bool, b *leastsq.Block) {
			t.eval(&t.blocks[i], p, d, derivatives, &own, b)
		},
	}, leastsq.Options{MaxIterations: mostIterations})
	if err != nil {
		return err
	}
	if fit.Status == leastsq.Stopped {
		return ctx.Err()
	}
	t.fit = fit
	return nil
}

// eval is a trial's residuals with their derivatives by the parameters of all; own is room for those by its revision's.
func (t *together) eval(x *revisionTrial, p, d []float64, derivatives bool, own, b *leastsq.Block) {
	m, at := t.models[x.revision], t.first[x.revision]
	m.eval(x.observed, p[at:at+m.params], d, derivatives, own)
	b.R, b.P, b.First, b.Second = append(b.R[:0], own.R...), b.P[:0], own.First, own.Second
	b.D[0], b.D[1] = append(b.D[0][:0], own.D[0]...), append(b.D[1][:0], own.D[1]...)
	if !derivatives {
		return
	}
	for r := range own.R {
		for j := range t.params {
			v := 0.0
			if j >= at && j < at+m.params && len(own.P) > 0 {
				v = own.P[r*m.params+j-at]
			}
			b.P = append(b.P, v)
		}
	}
}

func (t *together) dof() int {
	n := -t.params
	for _, x := range t.blocks {
		n += x.readings()
	}
	return n
}

// scatter is how many times more than they state (and than each revision's own fit allows for) all scatter; 1 where that
// may be chance.
func (t *together) scatter() float64 {
	dof := float64(t.dof())
	if dof <= 0 || (distuv.ChiSquared{K: dof}).Survival(t.fit.Chi2) >= 0.05 {
		return 1
	}
	return math.Sqrt(t.fit.Chi2 / dof)
}

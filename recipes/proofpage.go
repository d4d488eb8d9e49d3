package recipes

import (
	"context"
	_ "embed"
	"errors"
	"fmt"
	"slices"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"
)

//go:embed proofpage.go
var proofSource string

// Proof is the page of a confirmation: what was predicted for the latest decision in scope, before it was tried, beside
// what was then measured.
func Proof(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(proofSource)

	// ## Prediction and measurement
	//
	// A decision was logged with the digest of the trials it rests on. Only trials taken since then, with its network at
	// its operating point, count as proof.
	c, err := src.latestProof(ctx)
	if err != nil {
		return err
	}
	ProofPage(p, c)

	// ## The waveform
	//
	// The latest capture with the network fitted, and over it what the loop of the decision was computed to do. The two are
	// put together at the middle of the edge.
	after, err := src.captured(ctx, c.trials)
	if err != nil {
		return err
	}
	if after == nil {
		p.Say("No capture was logged with these trials; `ringbook trial take --waveform` logs one.")
		return nil
	}
	d := c.decision
	p.Plot(overlayPlot("Measured and predicted with "+wording(d.Network), after, d.Loop, d.Network, d.Excitation, d.LimitV))

	// ## The spectrum
	//
	// The bare node's capture that the decision rests on, beside the latest with the network: how far the ring's line fell.
	before, err := src.captured(ctx, c.bareTrials)
	if err != nil {
		return err
	}
	if before != nil {
		p.Plot(spectrumPlot(before, after, wording(d.Network)))
		sayLineFell(p, before, after)
	}
	return nil
}

// latestProof is the confirmation of the latest decision in scope that a trial can be held against.
func (s Source) latestProof(ctx context.Context) (*Confirmation, error) {
	var all []store.Decision // the latest last
	for d, err := range s.Logbook.Decisions(ctx, store.Scope{Board: s.Scope.Board, Revision: s.Scope.Revision}) {
		if err != nil {
			return nil, err
		}
		all = append(all, d)
	}
	unproven := fmt.Errorf("no decision is logged for %s %s; `ringbook recommend` logs the one it prints", s.Scope.Board, s.Scope.Revision)
	for i, d := range slices.Backward(all) {
		c, err := Confirm(ctx, s, d)
		if err == nil {
			return c, nil
		}
		if !errors.Is(err, ErrUnproven) {
			return nil, err
		}
		if i == len(all)-1 {
			unproven = err // of the latest: the one to take a trial for
		}
	}
	return nil, unproven
}

// captured is what the captures of the last of the trials that has any show; nil where none has.
func (s Source) captured(ctx context.Context, trials []snubber.Trial) (*Captured, error) {
	for i := len(trials) - 1; i >= 0; i-- {
		records, err := s.captures(ctx, trials[i].ID)
		if err != nil {
			return nil, err
		}
		if len(records) > 0 {
			return ReadCaptures(ctx, records)
		}
	}
	return nil, nil
}

// sayLineFell says how far the ring's line fell in the spectrum.
func sayLineFell(p *page.Page, before, after *Captured) {
	if err := after.Against(before); err != nil {
		p.Warn("%s.", err)
		return
	}
	p.Say("At the bare node's ring the spectrum fell by %.1f dB.", -after.Change.DB)
}

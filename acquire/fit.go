package acquire

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// ErrNoFitter says that no instrument of the rig can fit a network: a person has to.
var ErrNoFitter = errors.New("no instrument of the rig fits networks: solder it in, or give the instrument that switches networks a fit command")

// CanFit says whether an instrument of the rig fits networks.
func (s *Station) CanFit() bool { return s.fitter() != nil }

// Fit has the rig fit a network across the switch, by its nominal values. Without an instrument that can,
// the error is ErrNoFitter.
func (s *Station) Fit(ctx context.Context, n snubber.Network) error {
	in := s.fitter()
	if in == nil {
		return ErrNoFitter
	}
	if err := n.Check(); err != nil {
		return fmt.Errorf("fit a network: %w", err)
	}
	message, err := fitMessage(in.Fit, n)
	if err != nil {
		return fmt.Errorf("fit a network: %w", err)
	}
	in.holds = "" // until it was heard
	err = s.again(ctx, func() error {
		err := in.ready(ctx)
		if err == nil {
			err = in.send(ctx, message)
		}
		if err != nil {
			return in.fault("fit a network", err)
		}
		return nil
	})
	if err == nil {
		in.holds = message
	}
	return err
}

func (s *Station) fitter() *instrument {
	for _, in := range s.instruments {
		if in.Fit != "" {
			return in
		}
	}
	return nil
}

// fitMessage puts a network into a fit command. Values go in as NR3 numbers, so that nothing but a
// number can come of them.
func fitMessage(template string, n snubber.Network) (string, error) {
	message := strings.NewReplacer(
		"{network}", string(n.Kind),
		"{c}", scpi.Number(n.C).String(),
		"{r}", scpi.Number(n.R).String(),
	).Replace(template)
	if strings.ContainsAny(message, "{}") {
		return "", fmt.Errorf("fit command %q: only {network}, {c} and {r} may stand in braces", template)
	}
	if !strings.Contains(template, "{network}") && !strings.Contains(template, "{c}") {
		return "", fmt.Errorf("fit command %q: it must hold {network} or {c}, or every network would be the same", template)
	}
	header, _, err := scpi.ParseUnit(message)
	if err != nil {
		return "", err
	}
	if scpi.IsQuery(header) {
		return "", fmt.Errorf("fit command %q: a query fits nothing; its header must not end in ?", template)
	}
	return message, nil
}

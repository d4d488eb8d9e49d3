package acquire

import (
	"context"
	"fmt"
)

// SwitchPart has the instrument that the drawer names switch a part in, or out, and waits until it has.
func (s *Station) SwitchPart(ctx context.Context, p Part, in bool) error {
	doing, messages := "switch "+p.Name+" out", p.Unswitch
	if in {
		doing, messages = "switch "+p.Name+" in", p.Switch
	}
	card := s.named(p.Instrument)
	if card == nil {
		return fmt.Errorf("%s: the rig has no instrument %q", doing, p.Instrument)
	}
	return s.again(ctx, func() error {
		if err := card.tell(ctx, messages); err != nil {
			return card.fault(doing, err)
		}
		return nil
	})
}

// Serves gives an error for the first part of the drawer that no instrument of the rig can switch as the drawer says.
func (r Rig) Serves(d Drawer) error {
	known := map[string]bool{}
	for _, in := range r.Instruments {
		known[in.Name] = true
	}
	for _, p := range append(append([]Part{}, d.Capacitors...), d.Resistors...) {
		if p.Switched() && !known[p.Instrument] {
			return fmt.Errorf("drawer: %s is switched by instrument %q, which the rig does not have: name one of the rig file", p.Name, p.Instrument)
		}
	}
	return nil
}

// tell sends messages and waits until they are done.
func (in *instrument) tell(ctx context.Context, messages []string) error {
	if err := in.ready(ctx); err != nil {
		return err
	}
	for _, m := range messages {
		if err := in.send(ctx, m); err != nil {
			return err
		}
	}
	if in.NoErrorQueue { // one that knows no error queue may not know this either
		return nil
	}
	return in.send(ctx, "*OPC?")
}

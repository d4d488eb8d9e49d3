package store

import (
	"fmt"
	"strings"
	"time"

	"github.com/google/uuid"
)

// check reports the first thing in an entry from elsewhere that no logbook can hold.
func (e *entry) check() error {
	if err := checkID(e.id()); err != nil {
		return err
	}
	switch {
	case e.trial != nil:
		t := e.trial
		for i := range t.waveforms {
			w := &t.waveforms[i]
			if err := checkID(w.id); err != nil {
				return fmt.Errorf("waveform %d: %w", i+1, err)
			}
			if err := w.unpacked(); err != nil {
				return fmt.Errorf("waveform %s: %w", w.id, err)
			}
		}
		if t.Struck != "" {
			return fmt.Errorf("struck: %s; a strike is an entry of its own", quote(t.Struck))
		}
		if err := checkYear(t.loggedAt); err != nil {
			return err
		}
		if t.At.IsZero() {
			return bad("at", "it is missing")
		}
		return Check(t.Trial)
	case e.strike != nil:
		if strings.TrimSpace(e.strike.because) == "" || len(e.strike.because) > maxText {
			return bad("because", "%s; it must be a reason of at most %d bytes", quote(e.strike.because), maxText)
		}
		if err := checkYear(e.strike.at); err != nil {
			return err
		}
		return checkText("because", e.strike.because)
	case e.decision != nil:
		d := *e.decision
		d.ID = ""
		if err := checkYear(d.At); err != nil {
			return err
		}
		return checkDecision(d)
	default:
		c := e.correction
		b := Board{Name: c.board, DeviceV: c.deviceV, Note: c.note}
		if c.revision != "" {
			b.Revisions = []Revision{{Name: c.revision}}
			if c.deviceV != 0 {
				return bad("device_v", "%g of a revision; it is the board that has a rating", c.deviceV)
			}
		}
		if !c.at.IsZero() {
			if err := checkYear(c.at); err != nil {
				return err
			}
		}
		return checkBoard(b)
	}
}

// checkID accepts a UUID in the one form this logbook writes: 36 characters in lower case.
func checkID(id string) error {
	u, err := uuid.Parse(id)
	if err != nil || u.String() != id {
		return bad("id", "%s is not a UUID in its 36-character form", quote(id))
	}
	return nil
}

func checkYear(at time.Time) error {
	if y := at.UTC().Year(); y < 1900 || y > 9999 {
		return bad("at", "the year %d; it must lie from 1900 to 9999", y)
	}
	return nil
}

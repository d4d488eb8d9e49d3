package acquire

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// QuestionKind says what a question is about.
type QuestionKind string

// The kinds of question.
const (
	MakeSafe QuestionKind = "make safe" // see that the supply is off and the bus discharged
	FitPart  QuestionKind = "fit"       // fit a part
	SwitchOn QuestionKind = "switch on" // switch the supply on, where the rig cannot
	InDoubt  QuestionKind = "in doubt"  // is what was fitted really that?
	Trouble  QuestionKind = "trouble"   // an instrument failed: try again?
)

// Question is what a person is asked.
type Question struct {
	Kind    QuestionKind
	Text    string // one or more sentences
	Why     string // what for; "" where it goes without saying
	Choices string // what may be typed
	Again   string // what was wrong with the answer before; "" for none
}

// words are what may be typed besides values and the names of parts.
func words() []string { return []string{"bare", "skip", "again", "done", "keep", "wrong"} }

// answer is what a person typed, understood: a word, or a part, or neither for Enter alone.
type answer struct {
	word string
	part *Part
}

// ask puts a question until its answer is Enter, one of the words, or, where parts are asked for, a part.
func (s *Series) ask(ctx context.Context, q Question, parts bool, words ...string) (answer, error) {
	for {
		text, err := s.Ask(ctx, q)
		if err != nil {
			return answer{}, err
		}
		text = strings.TrimSpace(text)
		a, err := s.understand(text, parts, words)
		if err == nil {
			return a, nil
		}
		q.Again = err.Error()
	}
}

// confirm asks for nothing but Enter.
func (s *Series) confirm(ctx context.Context, q Question) error {
	a, err := s.ask(ctx, q, false, "done")
	if err == nil && a.word == "done" {
		return errDone
	}
	return err
}

func (s *Series) understand(text string, parts bool, words []string) (answer, error) {
	word := strings.ToLower(text)
	switch {
	case text == "":
		return answer{}, nil
	case slices.Contains(words, word):
		return answer{word: word}, nil
	case !parts:
		return answer{}, fmt.Errorf("%q: press Enter, or type %s", text, strings.Join(words, " or "))
	}
	p, err := s.part(text)
	if err != nil {
		return answer{}, err
	}
	return answer{part: &p}, nil
}

// part is the capacitor a person names: by its name in the drawer, or by its value, with or without a tolerance after it.
func (s *Series) part(text string) (Part, error) {
	for _, p := range s.Drawer {
		if strings.EqualFold(p.Name, text) {
			return p, nil
		}
	}
	value, tol, toleranced := strings.Cut(text, " ")
	p := Part{Tol: s.Tol}
	var err error
	if p.Value, err = read(new(quantity.Farad), value); err != nil {
		return p, fmt.Errorf("%w; or type the name of a part in the drawer", err)
	}
	if p.Value == 0 {
		return p, errors.New("0 F is no capacitor: type bare for the node alone")
	}
	if toleranced {
		if p.Tol, err = read(new(quantity.Fraction), strings.TrimSpace(tol)); err == nil && p.Tol >= 1 {
			err = fmt.Errorf("%q: a part of that tolerance may be nothing at all", tol)
		}
		return p, err
	}
	var same []Part
	for _, d := range s.Drawer {
		if alike(d.Value, p.Value) {
			same = append(same, d)
		}
	}
	switch len(same) {
	case 0:
		return p, nil
	case 1:
		return same[0], nil
	}
	var names []string
	for _, d := range same {
		names = append(names, d.Name)
	}
	return p, fmt.Errorf("%q: the drawer has %s of that value: type the name", text, strings.Join(names, " and "))
}

// alike says whether two values are the same but for rounding.
func alike(a, b float64) bool { return a-b < 1e-9*b && b-a < 1e-9*b }

// describePart is a capacitor in words: its value, and its name where it has one.
func describePart(n snubber.Network, name string) string {
	if n.Kind == snubber.Bare {
		return "the bare node"
	}
	text := farads(n.C)
	if name != "" {
		text += " (" + name + ")"
	}
	return text
}

// farads is a capacitance as it is printed on a part.
func farads(c float64) string { return quantity.Format(c, quantity.Capacitance, 0) }

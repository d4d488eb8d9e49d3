package acquire

import (
	"cmp"
	"errors"
	"fmt"
	"maps"
	"os"
	"slices"
	"strings"
	"time"

	"github.com/BurntSushi/toml"

	"ringbook/snubber/quantity"
)

// LoadDrawer reads a drawer file.
func LoadDrawer(path string) (Drawer, error) {
	data, err := os.ReadFile(path)
	if errors.Is(err, os.ErrNotExist) {
		return Drawer{}, fmt.Errorf("drawer file %s: there is no such file: write one that lists your parts", path)
	}
	if err != nil {
		return Drawer{}, fmt.Errorf("drawer file: %w", err)
	}
	return ParseDrawer(path, data)
}

// The drawer file as TOML has it. What a person may type without quotes is read as any.
type drawerFile struct {
	Capacitor map[string]partFile `toml:"capacitor"`
	Resistor  map[string]partFile `toml:"resistor"`
}

type partFile struct {
	Value      any    `toml:"value"`
	Tolerance  any    `toml:"tolerance"`
	Measured   any    `toml:"measured"`
	MeasuredU  any    `toml:"measured_u"`
	MeasuredAt any    `toml:"measured_at"`
	Dielectric string `toml:"dielectric"`
	Instrument string `toml:"instrument"`
	Switch     any    `toml:"switch"`
	Unswitch   any    `toml:"unswitch"`
}

// ParseDrawer reads a drawer file's text; name is for errors, which are *RigError and give the line. Unknown keys are errors,
// and so is a drawer with nothing in it.
func ParseDrawer(name string, data []byte) (Drawer, error) {
	var file drawerFile
	meta, err := toml.Decode(string(data), &file)
	if err != nil {
		return Drawer{}, syntaxError(name, err)
	}
	wrong := func(key []string, err error) error {
		return &RigError{File: name, Line: lineOf(string(data), key), Key: strings.Join(key, "."), Err: err}
	}
	if unknown := meta.Undecoded(); len(unknown) > 0 {
		cure := "the file holds [capacitor.NAME] and [resistor.NAME] tables"
		if len(unknown[0]) > 2 {
			cure = "a part has value, tolerance, measured, measured_u, measured_at, dielectric, instrument, switch and unswitch"
		}
		return Drawer{}, wrong(unknown[0], fmt.Errorf("there is no such key: %s", cure))
	}
	var d Drawer
	for _, kind := range []struct {
		name  string
		files map[string]partFile
		into  *[]Part
		set   func(string) (float64, error)
		like  string
	}{
		{"capacitor", file.Capacitor, &d.Capacitors, func(s string) (float64, error) { return read(new(quantity.Farad), s) }, "470p"},
		{"resistor", file.Resistor, &d.Resistors, func(s string) (float64, error) { return read(new(quantity.Ohm), s) }, "4R7"},
	} {
		for _, n := range slices.Sorted(maps.Keys(kind.files)) {
			p, key, err := kind.files[n].part(n, kind.set, kind.like)
			if err == nil {
				key, err = p.check()
			}
			if err != nil {
				path := []string{kind.name, n}
				if key != "" {
					path = append(path, key)
				}
				return Drawer{}, wrong(path, err)
			}
			*kind.into = append(*kind.into, p)
		}
		slices.SortStableFunc(*kind.into, func(a, b Part) int { return cmp.Compare(a.Value, b.Value) })
	}
	if len(d.Capacitors)+len(d.Resistors) == 0 {
		return Drawer{}, &RigError{File: name, Err: errors.New("there is no part in it: give at least one, as in [capacitor.C1] with value = \"470p\"")}
	}
	return d, nil
}

// read reads text as a flag of its quantity would.
func read[Q interface {
	*E
	Set(string) error
}, E ~float64](q Q, text string) (float64, error) {
	err := q.Set(text)
	return float64(*q), err
}

// part makes a part of its table, or says which key is wrong.
func (f partFile) part(name string, set func(string) (float64, error), like string) (p Part, key string, err error) {
	p = Part{Name: name, Dielectric: f.Dielectric, Instrument: f.Instrument}
	if err := checkPartName(name); err != nil {
		return p, "", err
	}
	if f.Value == nil {
		return p, "", fmt.Errorf("its value is missing: give what is printed on it, as in value = %q", like)
	}
	fraction := func(s string) (float64, error) { return read(new(quantity.Fraction), s) }
	for _, x := range []struct {
		key   string
		given any
		into  *float64
		set   func(string) (float64, error)
		like  string
	}{
		{"value", f.Value, &p.Value, set, like}, {"tolerance", f.Tolerance, &p.Tol, fraction, "5%"},
		{"measured", f.Measured, &p.Measured, set, like}, {"measured_u", f.MeasuredU, &p.MeasuredU, set, like},
	} {
		if x.given == nil {
			continue
		}
		text, quoted := x.given.(string)
		if !quoted {
			return p, x.key, fmt.Errorf("%v: write it in quotes with its unit's prefix, as in %s = %q", x.given, x.key, x.like)
		}
		if *x.into, err = x.set(text); err != nil {
			return p, x.key, err
		}
	}
	if f.MeasuredAt != nil {
		at, ok := f.MeasuredAt.(time.Time)
		if !ok {
			return p, "measured_at", fmt.Errorf("%v: write a day without quotes, as in measured_at = 2026-03-01", f.MeasuredAt)
		}
		p.MeasuredAt = at
	}
	if p.Switch, err = messages(f.Switch); err != nil {
		return p, "switch", err
	}
	if p.Unswitch, err = messages(f.Unswitch); err != nil {
		return p, "unswitch", err
	}
	return p, "", nil
}

// mostName is the longest name of a part, bytes: it has to fit on a line.
const mostName = 40

// checkPartName sees that a person can type the name, and that it is none of what else they may type.
func checkPartName(name string) error {
	switch {
	case strings.TrimSpace(name) != name || name == "":
		return fmt.Errorf("name %q: it is empty, or begins or ends with a blank", name)
	case len(name) > mostName:
		return fmt.Errorf("name %q: it is longer than %d bytes", name, mostName)
	case strings.ContainsFunc(name, func(r rune) bool { return r < ' ' || r == 0x7f || r == 0xfffd }):
		return fmt.Errorf("name %q: it has a character that cannot be printed", name)
	case slices.Contains(words(), strings.ToLower(name)):
		return fmt.Errorf("name %q: it means something else where parts are asked for: %s do", name, strings.Join(words(), ", "))
	}
	if _, err := read(new(quantity.Farad), name); err == nil {
		return fmt.Errorf("name %q: it reads as a value; add what tells this part from others, as in %q", name, name+"-a")
	}
	return nil
}

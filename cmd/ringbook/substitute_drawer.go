package main

import (
	"fmt"
	"slices"

	"ringbook/acquire"
	"ringbook/recipes"
	"ringbook/snubber"
)

// capacitorsOf are the values of a drawer's capacitors, F, each once.
func capacitorsOf(path string) ([]float64, error) {
	drawer, err := acquire.LoadDrawer(path)
	if err != nil {
		return nil, err
	}
	values, _ := valuesOf(drawer.Capacitors)
	if len(values) == 0 {
		return nil, noPart(path, "capacitor", "C1")
	}
	return values, nil
}

// fromDrawer has a network chosen among the parts of a drawer alone, where the flags do not name parts already. Parts are
// taken at what is printed on them, with the widest of their tolerances: each may be the one that is fitted.
func fromDrawer(path string, r *recipes.Request) error {
	drawer, err := acquire.LoadDrawer(path)
	if err != nil {
		return err
	}
	for _, x := range []struct {
		name, like string
		parts      []acquire.Part
		values     *[]float64
		tol        *float64
		wanted     bool
	}{
		{"capacitor", "C1", drawer.Capacitors, &r.Limits.OnHandC, &r.Limits.CTol, true},
		{"resistor", "R1", drawer.Resistors, &r.Limits.OnHandR, &r.Limits.RTol, slices.ContainsFunc(r.Limits.Kinds, snubber.Kind.HasR)},
	} {
		if *x.values != nil || !x.wanted {
			continue
		}
		values, tol := valuesOf(x.parts)
		if len(values) == 0 {
			return noPart(path, x.name, x.like)
		}
		if *x.values = values; *x.tol == 0 {
			*x.tol = tol
		}
	}
	return nil
}

// valuesOf are the values of parts, each once, and the widest of their tolerances.
func valuesOf(parts []acquire.Part) (values []float64, tol float64) {
	for _, p := range parts {
		if tol = max(tol, p.Tol); !slices.Contains(values, p.Value) {
			values = append(values, p.Value)
		}
	}
	return values, tol
}

func noPart(path, kind, like string) error {
	return fmt.Errorf("drawer file %s: there is no %s in it: give one, as in [%s.%s]", path, kind, kind, like)
}

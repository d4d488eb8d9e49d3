package snubber

import (
	"context"
	"errors"
	"fmt"
)

// Grid is what rc networks of every pair of C and R do: rows by C, columns by R.
type Grid struct {
	C       []float64   `json:"c_f"`
	R       []float64   `json:"r_ohm"`
	Peak    [][]float64 `json:"peak_v"`        // V
	Loss    [][]float64 `json:"loss_w"`        // W, all of it
	Damping [][]float64 `json:"damping_ratio"` // of the ringing pair; 1 where nothing rings
}

// Sweep computes a grid of rc networks at hz cycles a second, from capacitors cs (F) and resistors rs (ohm), as given.
func Sweep(ctx context.Context, l Loop, e Excitation, hz float64, cs, rs []float64) (Grid, error) {
	if len(cs) == 0 || len(rs) == 0 {
		return Grid{}, errors.New("sweeping over R and C: there must be at least one of each")
	}
	g := Grid{C: append([]float64{}, cs...), R: append([]float64{}, rs...)}
	for _, c := range cs {
		if err := ctx.Err(); err != nil {
			return Grid{}, fmt.Errorf("sweeping over R and C: %w", err)
		}
		peak, watts, damping := make([]float64, len(rs)), make([]float64, len(rs)), make([]float64, len(rs))
		for j, r := range rs {
			n := Network{Kind: RC, R: r, C: c}
			resp, err := Respond(l, n, e)
			if err != nil {
				return Grid{}, fmt.Errorf("sweeping over R and C: %w", err)
			}
			loss, err := SwitchingLoss(l, n, e, hz)
			if err != nil {
				return Grid{}, fmt.Errorf("sweeping over R and C: %w", err)
			}
			peak[j], watts[j], damping[j] = resp.Peak().Volts, loss.Total, resp.DampingRatio()
		}
		g.Peak, g.Loss, g.Damping = append(g.Peak, peak), append(g.Loss, watts), append(g.Damping, damping)
	}
	return g, nil
}

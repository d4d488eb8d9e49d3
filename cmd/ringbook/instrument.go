package main

import (
	"time"

	"ringbook/acquire"
	"ringbook/recipes/page"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

func instrumentCommand(a *app) *cobra.Command {
	return group("instrument", "The instruments of the rig", `  ringbook instrument check --rig rig.toml`, instrumentCheck(a))
}

func instrumentCheck(a *app) *cobra.Command {
	var rigFile string
	cmd := &cobra.Command{
		Use:   "check",
		Short: "Ask every instrument who it is and every reading once",
		Long: `check opens each instrument of the rig by itself, asks who it is, has it test itself, asks for each of its readings
once, and looks into its error queue. A line each says what came back, how long it took, and, where it is not as it should
be, what is wrong and the cure; the exit code is then 3. Nothing is logged, and no output is switched.`,
		Example: `  ringbook instrument check
  ringbook instrument check --rig bench-2.toml --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) error {
			rig, err := acquire.LoadRig(rigFile)
			if err != nil {
				return err
			}
			asked := ""
			verdicts, err := acquire.CheckRig(cmd.Context(), rig, func(v acquire.Verdict) {
				if v.Instrument != asked {
					a.progress("checking %s", v.Instrument)
					asked = v.Instrument
				}
			})
			if err != nil {
				return err
			}
			if a.json {
				err = a.printJSON(verdictsJSON(verdicts))
			} else {
				err = a.print(verdictsPage(rigFile, verdicts))
			}
			if err == nil && failing(verdicts) > 0 {
				return errNo
			}
			return err
		},
	}
	cmd.Flags().StringVar(&rigFile, "rig", "rig.toml", "`FILE` with the instruments and what to ask of them")
	return cmd
}

func verdictWord(v acquire.Verdict) string {
	if v.OK {
		return "good"
	}
	return "fails"
}

func failing(verdicts []acquire.Verdict) (n int) {
	for _, v := range verdicts {
		if !v.OK {
			n++
		}
	}
	return n
}

// verdictsPage is a line for each verdict, and below the table what is wrong and how to cure it.
func verdictsPage(rigFile string, verdicts []acquire.Verdict) *page.Page {
	p := page.New("Instruments of " + rigFile)
	t := page.NewTable("Check",
		page.Label("instrument", "instrument"), page.Label("asked for", "what"), page.Label("verdict", "verdict"),
		page.Label("reply", "reply"), page.Number("time", quantity.Time, "took_s"))
	for _, v := range verdicts {
		var took any
		if v.Took > 0 {
			took = v.Took.Round(10 * time.Microsecond).Seconds()
		}
		row := t.Row(v.Instrument, v.What, verdictWord(v), v.Reply, took)
		switch {
		case v.Problem != "" && v.Cure != "":
			row.Note("%s: %s", v.Problem, v.Cure)
		case v.Problem != "":
			row.Note("%s", v.Problem)
		}
	}
	p.Table(t)
	switch n := failing(verdicts); n {
	case 0:
		p.Say("All is well.")
	case 1:
		p.Say("1 of %d lines is not as it should be.", len(verdicts))
	default:
		p.Say("%d of %d lines are not as they should be.", n, len(verdicts))
	}
	return p
}

func verdictsJSON(verdicts []acquire.Verdict) any {
	type line struct {
		Instrument string  `json:"instrument"`
		What       string  `json:"what"`
		OK         bool    `json:"ok"`
		Reply      string  `json:"reply"`
		TookS      float64 `json:"took_s"`
		Problem    string  `json:"problem"`
		Cure       string  `json:"cure"`
	}
	lines := []line{}
	for _, v := range verdicts {
		lines = append(lines, line{v.Instrument, v.What, v.OK, v.Reply, v.Took.Seconds(), v.Problem, v.Cure})
	}
	return map[string]any{"ok": failing(verdicts) == 0, "verdicts": lines}
}

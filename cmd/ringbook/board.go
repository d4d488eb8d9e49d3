package main

import (
	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber/quantity"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func boardCommand(a *app) *cobra.Command {
	return group("board", "Boards and their revisions, with the device's voltage rating",
		`  ringbook board add winch-drive --revision B --rating 100V
  ringbook board list`, boardAdd(a), boardList(a))
}

func boardAdd(a *app) *cobra.Command {
	var rating quantity.Volt
	var note string
	var revisions []string
	var correct bool
	cmd := &cobra.Command{
		Use:   "add NAME",
		Short: "Put a board, its revisions and its device's rating on file",
		Long: `add puts a board on file, or adds to one that is: a rating, a note, revisions. A rating that differs from the
one on file is refused unless --correct says that the one on file was wrong. Trials are never touched.`,
		Example: `  ringbook board add winch-drive --revision A --revision B --rating 100V --note "half bridge, low side"
  ringbook board add winch-drive --rating 80V --correct`,
		Args: words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			b := store.Board{Name: args[0], DeviceV: float64(rating), Note: note}
			for _, r := range revisions {
				b.Revisions = append(b.Revisions, store.Revision{Name: r})
			}
			put := lb.AddBoard
			if correct {
				put = lb.CorrectBoard
			}
			if err := put(ctx, b); err != nil {
				return err
			}
			if a.json {
				return a.printJSON(map[string]any{"board": b.Name, "revisions": append([]string{}, revisions...)})
			}
			return a.say("Board %s is on file in %s.", b.Name, lb.Path())
		},
	}
	f := cmd.Flags()
	f.Var(&rating, "rating", "the switch's rated voltage")
	f.StringVar(&note, "note", "", "`WORDS` to remember")
	f.StringArrayVar(&revisions, "revision", nil, "`NAME` of a revision; may be given several times")
	f.BoolVar(&correct, "correct", false, "replace the rating and the note on file by those given")
	return cmd
}

func boardList(a *app) *cobra.Command {
	return &cobra.Command{
		Use:     "list",
		Short:   "Every board with its revisions and how many trials stand",
		Example: `  ringbook board list --json`,
		Args:    words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			if a.json {
				boards, err := lb.Boards(ctx)
				if err != nil {
					return err
				}
				return a.printJSON(boardsJSON(boards))
			}
			p := page.New("Boards")
			if err := recipes.Boards(ctx, p, recipes.Source{Logbook: lb}); err != nil {
				return err
			}
			return a.print(p)
		},
	}
}

func boardsJSON(boards []store.Board) any {
	type revision struct {
		Revision string `json:"revision"`
		Trials   int    `json:"trials"`
	}
	type board struct {
		Board     string     `json:"board"`
		RatingV   *float64   `json:"rating_v"`
		Note      string     `json:"note"`
		Revisions []revision `json:"revisions"`
	}
	all := []board{}
	for _, b := range boards {
		x := board{Board: b.Name, Note: b.Note, Revisions: []revision{}}
		if b.DeviceV > 0 {
			x.RatingV = &b.DeviceV
		}
		for _, r := range b.Revisions {
			x.Revisions = append(x.Revisions, revision{r.Name, r.Trials})
		}
		all = append(all, x)
	}
	return map[string]any{"boards": all}
}

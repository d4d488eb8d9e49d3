package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"slices"
	"strings"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

func pageCommand(a *app) *cobra.Command {
	var scope scopeFlags
	var limits limitsFlags
	var onHand []string
	var out, listen string
	var force, watch bool
	cmd := &cobra.Command{
		Use:   "page [RECIPE]",
		Short: "Weave a page of the lab notebook: prose, code, tables and plots",
		Long: `page weaves a recipe with what the logbook holds and prints it, or writes it to the file that -o names: HTML, Markdown,
CSV, LaTeX or text by its ending, .html, .md, .csv, .tex or .txt. The plots of Markdown and LaTeX stand beside it. The same
logbook gives the same page, to the byte. Without RECIPE it lists the recipes there are.

Where a recipe fails, the page says so at the place and the exit code is 1; it is written or printed all the same where it
has a table, figures or a plot. --watch serves the page to browsers on this computer and weaves it anew when a trial is logged.`,
		Example: `  ringbook page
  ringbook page substitution --board winch-drive --revision B
  ringbook page choice --max-peak 80V --c-tol 5% -o choice.html
  ringbook page substitution --watch`,
		Args:      words(0, 1),
		ValidArgs: recipeNames(),
		RunE: func(cmd *cobra.Command, args []string) error {
			debug.SetGCPercent(40) // a page of very many trials is built in memory once: a little time for a third of it
			listens := cmd.Flags().Changed("listen")
			if len(args) == 0 {
				if out != "" || watch || listens {
					return usagef("page: no RECIPE; it is one of %s", strings.Join(recipeNames(), ", "))
				}
				return a.listRecipes()
			}
			r, err := recipeNamed(args[0])
			if err != nil {
				return err
			}
			if given := limits.given(); given != "" && !r.Limits {
				return usagef("page %s: %s: this page recommends no network; leave it out", r.Name, given)
			}
			w := weaving{recipe: r, flags: &scope}
			if w.limits, err = limits.read(); err != nil {
				return err
			}
			if w.onHand, err = partsOnHand("on-hand", onHand, func() flagValue { return new(quantity.Farad) }); err != nil {
				return err
			}
			switch {
			case watch && out != "":
				return usagef("page: --watch and -o %q: give one or the other", out)
			case watch:
				return a.watchPage(cmd.Context(), w, listen)
			case listens:
				return usagef("page: --listen %q: it goes with --watch", listen)
			}
			return a.weavePage(cmd.Context(), w, out, force)
		},
	}
	scope.add(cmd)
	limits.add(cmd)
	f := cmd.Flags()
	f.StringVarP(&out, "out", "o", "", "write the page to `FILE`, as its ending says")
	f.BoolVar(&force, "force", false, "replace the file, and the plots beside it")
	f.StringSliceVar(&onHand, "on-hand", nil, "the `CAPACITORS` on hand, such as 100p,330p: which would tell most next")
	f.BoolVar(&watch, "watch", false, "serve the page to browsers on this computer, and weave it anew when a trial is logged")
	f.StringVar(&listen, "listen", "127.0.0.1:0", "`ADDRESS` of this computer to serve it at; port 0: a free one")
	cmd.AddCommand(pageNew(a))
	return cmd
}

// weaving is which page is woven from what.
type weaving struct {
	recipe recipes.Recipe
	flags  *scopeFlags
	limits recipes.Request
	onHand []float64
}

// weave opens the logbook and weaves the page.
func (a *app) weave(ctx context.Context, w weaving) (_ *recipes.Woven, err error) {
	scope, err := w.flags.read()
	if err != nil {
		return nil, err
	}
	lb, err := a.read(ctx)
	if err != nil {
		return nil, err
	}
	defer closing(lb, &err)
	return w.recipe.Page(ctx, recipes.Source{Logbook: lb, Scope: scope, Limits: w.limits, OnHand: w.onHand})
}

// outFile is the file that -o names; nil where it names none.
func outFile(out string, force bool) (*recipes.File, error) {
	if out == "" {
		return nil, nil
	}
	file, err := recipes.NewFile(out, force)
	if errors.Is(err, recipes.ErrEnding) {
		return nil, &usageError{err}
	}
	return file, err
}

// weavePage weaves a page once, to a file or to standard output.
func (a *app) weavePage(ctx context.Context, w weaving, out string, force bool) error {
	file, err := outFile(out, force)
	if err != nil {
		return err
	}
	woven, failed := a.weave(ctx, w)
	if failed != nil && (woven == nil || woven.Empty) {
		return severalIsUsage(failed)
	}
	answer := wovenAnswer{Files: []string{}, Recipe: w.recipe.Name, Digest: woven.Digest, Warnings: warnings(woven.Page)}
	if failed != nil {
		answer.Error = new(failed.Error())
	}
	switch {
	case file != nil:
		if answer.Files, err = file.Write(woven.Page); err != nil {
			return errors.Join(failed, err)
		}
		answer.File = &answer.Files[0]
		for _, name := range answer.Files {
			if !a.json { // its own field says it
				a.progress("wrote %s", name)
			}
		}
	case !a.json:
		err = woven.Text(a.stdout, page.TextOptions{Width: a.width(), Colour: a.colour(), Prose: true})
	}
	if a.json && err == nil {
		err = a.printJSON(answer)
	}
	return errors.Join(failed, err)
}

// wovenAnswer is what page says under --json.
type wovenAnswer struct {
	File     *string  `json:"file"`  // the page; null where none was written
	Files    []string `json:"files"` // and its plots
	Recipe   string   `json:"recipe"`
	Digest   string   `json:"digest"` // of the trials it was woven from
	Warnings []string `json:"warnings"`
	Error    *string  `json:"error"` // why the recipe failed, and with it the command; null where it did not
}

// warnings are those on a page, as its text has them.
func warnings(p *page.Page) []string {
	const unwrapped = 1 << 30
	list := []string{}
	var text bytes.Buffer
	if err := p.Text(&text, page.TextOptions{Width: unwrapped}); err != nil {
		return list // writing the page fails for the same reason, and says it
	}
	for line := range strings.Lines(text.String()) {
		if said, ok := strings.CutPrefix(line, "Warning: "); ok {
			list = append(list, strings.TrimSuffix(said, "\n"))
		}
	}
	return list
}

func recipeNames() []string {
	var names []string
	for _, r := range recipes.All() {
		names = append(names, r.Name)
	}
	return names
}

func recipeNamed(name string) (recipes.Recipe, error) {
	all := recipes.All()
	i := slices.IndexFunc(all, func(r recipes.Recipe) bool { return r.Name == name })
	if i < 0 {
		return recipes.Recipe{}, usagef("page %q: there is no such recipe; it is one of %s, or one of your own by `ringbook page new`", name, strings.Join(recipeNames(), ", "))
	}
	return all[i], nil
}

// listRecipes prints what pages there are.
func (a *app) listRecipes() error {
	all := recipes.All()
	if a.json {
		type entry struct {
			Name  string `json:"name"`
			Shows string `json:"shows"`
		}
		list := []entry{}
		for _, r := range all {
			list = append(list, entry{r.Name, r.Short})
		}
		return a.printJSON(map[string]any{"recipes": list})
	}
	p := page.New("Recipes")
	t := page.NewTable("", page.Label("recipe", "recipe"), page.Words("what its page shows", "shows"))
	for _, r := range all {
		t.Row(r.Name, r.Short)
	}
	p.Table(t)
	p.Say("`ringbook page RECIPE` prints one, `-o FILE` writes it; `ringbook page new NAME` begins one of your own.")
	if err := a.print(p); err != nil {
		return fmt.Errorf("writing the list: %w", err)
	}
	return nil
}

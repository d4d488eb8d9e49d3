package main

import (
	_ "embed"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"strconv"
	"strings"

	"ringbook/recipes"

	"github.com/spf13/cobra"
)

// recipeTemplate is the file that a recipe of one's own begins as. NAME stands for its name.
//
//go:embed page_new.txt
var recipeTemplate string

func pageNew(a *app) *cobra.Command {
	var dir, checkout string
	var force bool
	cmd := &cobra.Command{
		Use:   "new NAME",
		Short: "Begin a page of one's own: a recipe that runs, and the go.mod that builds it",
		Long: `new writes NAME.go, a recipe that runs as it stands and is there to be changed, and go.mod and go.sum beside it, so that
` + "`go run .`" + ` in that folder weaves its page, with no network. The recipe is built against this program's source: where the
program was built, or where --checkout says.`,
		Example: `  ringbook page new peaks --dir peaks
  ringbook page new peaks --checkout ~/src/ringbook`,
		Args: words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) error {
			name := args[0]
			if !recipeName.MatchString(name) {
				return usagef("page new %q: a name begins with a lower-case letter and has lower-case letters, digits and hyphens alone, such as peaks", name)
			}
			source, err := findCheckout(checkout)
			if err != nil {
				return err
			}
			paths, err := writeRecipe(name, dir, source, force)
			if err != nil {
				return err
			}
			if a.json {
				return a.printJSON(map[string]any{"files": paths, "checkout": source})
			}
			logbook, err := filepath.Abs(a.logbook)
			if err != nil {
				return fmt.Errorf("page new: %w", err)
			}
			return a.say(`%s is a recipe that runs as it stands; its comments are the page's prose. From its folder:

  go run . -logbook %q
  go run . -logbook %[2]q -o %s.html

Then change it, and run it again.`, paths[0], logbook, name)
		},
	}
	f := cmd.Flags()
	f.StringVar(&dir, "dir", ".", "`FOLDER` to write it in, made where there is none")
	f.StringVar(&checkout, "checkout", "", "`FOLDER` of this program's source, where it is not where the program was built")
	f.BoolVar(&force, "force", false, "replace the files")
	return cmd
}

// recipeName has no underscore: Go takes what follows one in a file's name for an operating system, or for a test.
var recipeName = regexp.MustCompile(`^[a-z][a-z0-9-]{0,63}$`)

// writeRecipe writes the recipe and its module, all or nothing, and gives the files' paths.
func writeRecipe(name, dir, checkout string, replace bool) (paths []string, err error) {
	mod, err := os.ReadFile(filepath.Join(checkout, "go.mod"))
	if err != nil {
		return nil, fmt.Errorf("page new: %w", err)
	}
	sum, err := os.ReadFile(filepath.Join(checkout, "go.sum"))
	if err != nil {
		return nil, fmt.Errorf("page new: %w", err)
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, fmt.Errorf("page new: %w", err)
	}
	files := []recipes.Content{
		{Path: filepath.Join(dir, "go.sum"), Text: sum},
		{Path: filepath.Join(dir, "go.mod"), Text: moduleOf(name, checkout, mod)},
		{Path: filepath.Join(dir, name+".go"), Text: []byte(strings.ReplaceAll(recipeTemplate, "NAME", name))},
	}
	err = recipes.WriteAll(files, replace)
	if errors.Is(err, recipes.ErrExists) {
		return nil, fmt.Errorf("page new %s: %w; each recipe has a folder of its own, which --dir names", name, err)
	} else if err != nil {
		return nil, fmt.Errorf("page new %s: %w", name, err)
	}
	return []string{files[2].Path, files[1].Path, files[0].Path}, nil
}

// moduleOf is the go.mod of a recipe that is built against a checkout: the same requirements, and the checkout itself.
func moduleOf(name, checkout string, mod []byte) []byte {
	_, rest, _ := strings.Cut(string(mod), "\n") // its first line names this program's module
	if strings.ContainsAny(checkout, " \t()[]{},\"'`") || strings.Contains(checkout, "//") {
		checkout = strconv.Quote(checkout)
	}
	return fmt.Appendf(nil, "module notebook/%s\n%s\nrequire ringbook v0.0.0\n\nreplace ringbook => %s\n", name, rest, checkout)
}

// findCheckout is the absolute path of this program's source: as told, or where the compiler found this very file.
func findCheckout(told string) (string, error) {
	if told != "" {
		dir, err := filepath.Abs(told)
		if err == nil {
			err = isCheckout(dir)
		}
		if err != nil {
			return "", fmt.Errorf("page new: --checkout %q: %w", told, err)
		}
		return dir, nil
	}
	_, file, _, ok := runtime.Caller(0)
	dir := filepath.Join(filepath.Dir(file), "..", "..")
	if !ok || !filepath.IsAbs(file) || isCheckout(dir) != nil { // -trimpath, or moved since
		return "", errors.New("page new: the source that this program was built from is not on this computer; name the folder of a checkout of it with --checkout")
	}
	return dir, nil
}

// isCheckout says why a folder is not this program's source; nil where it is.
func isCheckout(dir string) error {
	mod, err := os.ReadFile(filepath.Join(dir, "go.mod"))
	if errors.Is(err, fs.ErrNotExist) {
		return errors.New("there is no go.mod in it; name the top folder of this program's source")
	} else if err != nil {
		return err
	}
	if first, _, _ := strings.Cut(string(mod), "\n"); strings.TrimSpace(first) != "module ringbook" {
		return fmt.Errorf("its go.mod begins with %q; name the top folder of this program's source", first)
	}
	if _, err := os.Stat(filepath.Join(dir, "recipes", "main.go")); err != nil {
		return errors.New("it has no recipes/main.go; name a newer checkout of this program's source")
	}
	return nil
}

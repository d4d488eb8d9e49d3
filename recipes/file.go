package recipes

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"ringbook/recipes/page"
)

// File is a file to write a page to. Its ending says how: .html, .md, .csv, .tex or .txt.
type File struct {
	path    string
	form    form
	replace bool // what stands there may be replaced
}

// form writes a page as its file's ending has it.
type form func(*page.Page, io.Writer, page.Keep) error

var endings = [...]string{".html", ".md", ".csv", ".tex", ".txt"}

func formOf(ending string) form {
	switch ending {
	case ".html":
		return func(p *page.Page, w io.Writer, _ page.Keep) error { return p.HTML(w) }
	case ".md":
		return func(p *page.Page, w io.Writer, keep page.Keep) error {
			return p.Markdown(w, page.MarkdownOptions{Keep: keep})
		}
	case ".csv":
		return func(p *page.Page, w io.Writer, _ page.Keep) error { return p.CSV(w) }
	case ".tex":
		return func(p *page.Page, w io.Writer, keep page.Keep) error {
			return p.LaTeX(w, page.LaTeXOptions{Keep: keep})
		}
	case ".txt":
		return func(p *page.Page, w io.Writer, _ page.Keep) error {
			return p.Text(w, page.TextOptions{Prose: true})
		}
	}
	return nil
}

// ErrEnding is of a file whose ending names no form of a page.
var ErrEnding = errors.New("its ending must be one of " + strings.Join(endings[:], ", "))

// ErrExists is of a file that stands and may not be replaced.
var ErrExists = errors.New("it exists; name another file, or replace it with --force")

// NewFile says where a page is to go, and writes nothing. Errors: ErrEnding, ErrExists where the file exists and replace is
// false, and what else forbids it now.
func NewFile(path string, replace bool) (*File, error) {
	f := &File{path: path, form: formOf(strings.ToLower(filepath.Ext(path))), replace: replace}
	if f.form == nil || strings.TrimSuffix(filepath.Base(path), filepath.Ext(path)) == "" {
		return nil, fmt.Errorf("write the page to %q: %w", path, ErrEnding)
	}
	if err := free(path, replace); err != nil {
		return nil, fmt.Errorf("write the page to %q: %w", path, err)
	}
	if info, err := os.Stat(filepath.Dir(path)); err != nil || !info.IsDir() {
		return nil, fmt.Errorf("write the page to %q: there is no folder %s; make it first, or name another file", path, filepath.Dir(path))
	}
	return f, nil
}

// free says why a file may not be put at path; nil where it may.
func free(path string, replace bool) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		return cause(err)
	case info.IsDir():
		return errors.New("it is a folder; name a file in it")
	case !info.Mode().IsRegular():
		return errors.New("it is not a regular file; name another file")
	case !replace:
		return ErrExists
	}
	return nil
}

// Write writes the page, and the plots of Markdown (SVG) and LaTeX (PNG) beside it: those of loop.md are loop-1.svg,
// loop-2.svg and so on. It gives the files' paths, the page's first.
//
// They are written as by WriteAll, the page last: a program that is killed may leave some new plots beside an old page.
func (f *File) Write(p *page.Page) (paths []string, err error) {
	// What is replaced may be a link to a file; that file is meant.
	path := f.path
	if to, err := filepath.EvalSymlinks(path); err == nil {
		path = to
	}
	dir, ending := filepath.Dir(path), filepath.Ext(path)
	stem := strings.TrimSuffix(filepath.Base(path), ending)
	var all []Content
	var text bytes.Buffer
	if err := f.form(p, &text, func(name string, plot []byte) (string, error) {
		name = stem + strings.TrimPrefix(name, "plot")
		all = append(all, Content{filepath.Join(dir, name), plot})
		return name, nil
	}); err != nil {
		return nil, err
	}
	all = append(all, Content{path, text.Bytes()})
	if err := WriteAll(all, f.replace); err != nil {
		return nil, err
	}
	paths = []string{f.path}
	for _, c := range all[:len(all)-1] {
		paths = append(paths, c.Path)
	}
	return paths, nil
}

// cause is an error of the file system without the call and the name, which stand before it.
func cause(err error) error {
	var p *fs.PathError
	var l *os.LinkError
	switch {
	case errors.As(err, &p):
		return p.Err
	case errors.As(err, &l):
		return l.Err
	}
	return err
}

package main

import (
	"bufio"
	"encoding/json"
	"fmt"
	"io"
)

// listWriter writes one JSON object with one list in it, an item a line.
type listWriter struct {
	w *bufio.Writer
	n int
}

func newListWriter(w io.Writer, name string) *listWriter {
	l := &listWriter{w: bufio.NewWriter(w)}
	fmt.Fprintf(l.w, "{%q: [", name)
	return l
}

func (l *listWriter) add(item any) error {
	text, err := json.Marshal(item)
	if err != nil {
		return fmt.Errorf("writing the answer: %w", err)
	}
	sep := ",\n"
	if l.n == 0 {
		sep = "\n"
	}
	l.n++
	if _, err := fmt.Fprintf(l.w, "%s%s", sep, text); err != nil {
		return fmt.Errorf("writing the answer: %w", err)
	}
	return nil
}

func (l *listWriter) close() error { return l.end("\n]}\n") }

// closeWith ends the object with one more field.
func (l *listWriter) closeWith(name string, value any) error {
	text, err := json.Marshal(value)
	if err != nil {
		return fmt.Errorf("writing the answer: %w", err)
	}
	return l.end(fmt.Sprintf("\n],\n%q: %s}\n", name, text))
}

func (l *listWriter) end(text string) error {
	fmt.Fprint(l.w, text)
	if err := l.w.Flush(); err != nil {
		return fmt.Errorf("writing the answer: %w", err)
	}
	return nil
}

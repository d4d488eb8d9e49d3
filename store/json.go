package store

import (
	"bufio"
	"bytes"
	"context"
	"database/sql"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"path/filepath"
)

// exportFormat is the first line of an export, by which an import knows it.
const exportFormat = `{"ringbook":"entries 1"}`

// maxLine bounds one line of an import, in bytes: a trial with its waveforms.
const maxLine = 1 << 30

// ExportJSON writes the whole logbook as JSON Lines, in UTF-8: after a line {"ringbook":"entries 1"}, a line for each entry
// in the order of its chain, {"trial": ..., "origin": ...} or the same with strike, decision or correction. Nothing is left
// out: readings with their instruments and repeats, waveforms with their packed samples, strikes as lines of their own, and of
// each entry where it was first logged with its links there. Names and units are those of the tables, unscaled SI; what is
// not stated is left out. ImportJSON reads it back without losing a bit.
//
// Each entry is audited on its way; one that is not what was logged is an error of kind ErrDamaged. It says how many entries
// it wrote, and tells progress, unless nil, how many of all so far.
func (lb *Logbook) ExportJSON(ctx context.Context, w io.Writer, progress func(done, all int64)) (n int, err error) {
	fail := func(err error) (int, error) { return n, fmt.Errorf("export: %w", err) }
	schema, err := schemaOf(ctx, lb.db)
	if err != nil {
		return fail(explain(lb.path, err))
	}
	if schema < 4 {
		return fail(fmt.Errorf("the logbook's schema, %d, chains no entries; open it for writing once to chain them", schema))
	}
	tx, err := lb.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return fail(explain(lb.path, err))
	}
	defer tx.Rollback() // it only read
	out := bufio.NewWriter(w)
	if _, err := out.WriteString(exportFormat + "\n"); err != nil {
		return fail(err)
	}
	lines := json.NewEncoder(out)
	err = lb.entries(ctx, tx, progress, func(e *entry, origin place) error {
		n++
		return lines.Encode(lineOf(e, origin))
	})
	if err != nil {
		return fail(err)
	}
	if err := out.Flush(); err != nil {
		return fail(err)
	}
	return n, nil
}

// ImportJSON adds the entries of an export that are not here yet, as Merge does those of a logbook: by their ids, each
// checked against its link, all of them in one transaction or none. An error names the line. Where r has a Name, as *os.File
// does, errors begin with it. progress, unless nil, is told the entries so far every thousand of them.
func (lb *Logbook) ImportJSON(ctx context.Context, r io.Reader, progress func(n int)) (m Merged, err error) {
	name := ""
	if named, ok := r.(interface{ Name() string }); ok {
		name = filepath.Base(named.Name()) + " "
	}
	in := bufio.NewReaderSize(r, 1<<16)
	unwatched := context.WithoutCancel(ctx)
	line := 0
	err = lb.write(ctx, func(w *writer) error {
		for {
			text, err := readLine(in)
			line++
			switch {
			case err == io.EOF && line > 1:
				return nil
			case err == io.EOF:
				return fmt.Errorf("%sis empty; an export begins with the line %s", name, exportFormat)
			case err != nil:
				return fmt.Errorf("%sline %d: %w", name, line, err)
			case line == 1:
				if string(text) != exportFormat {
					return fmt.Errorf("%sline 1: %s is not %s; the file is no export, or one of a newer ringbook", name, quote(string(text)), exportFormat)
				}
				continue
			}
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := w.takeLine(unwatched, text, &m); err != nil {
				return fmt.Errorf("%sline %d: %w", name, line, err)
			}
			if n := line - 1; progress != nil && n%1000 == 0 {
				progress(n)
			}
		}
	})
	if err != nil {
		return Merged{}, fmt.Errorf("import: %w", err)
	}
	return m, nil
}

func (w *writer) takeLine(ctx context.Context, text []byte, m *Merged) error {
	var l jsonLine
	d := json.NewDecoder(bytes.NewReader(text))
	d.DisallowUnknownFields() // what is not known would be lost
	if err := d.Decode(&l); err != nil {
		return fmt.Errorf("%s: %w", quote(string(text)), err)
	}
	if d.More() {
		return fmt.Errorf("%s: it goes on after its object", quote(string(text)))
	}
	e, origin, err := l.entry()
	if err != nil {
		return err
	}
	fault := func(what string) error {
		return fmt.Errorf("%s %s is %w: %s", e.kind(), quote(e.id()), ErrDamaged, what)
	}
	if origin.seal(e.text(nil), nil) != origin.link {
		return fault("its text does not give its link, so it is not what was logged; export it again")
	}
	return w.take(ctx, e, origin, m, fault)
}

// readLine is the next line without its end; io.EOF after the last.
func readLine(in *bufio.Reader) ([]byte, error) {
	var line []byte
	for {
		part, err := in.ReadSlice('\n')
		line = append(line, part...)
		switch {
		case len(line) > maxLine:
			return nil, fmt.Errorf("it has more than %d bytes", maxLine)
		case errors.Is(err, bufio.ErrBufferFull):
			continue
		case err == io.EOF && len(line) > 0, err == nil:
			return bytes.TrimRight(line, "\r\n"), nil
		default:
			return nil, err
		}
	}
}

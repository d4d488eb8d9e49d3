package main

import (
	"bufio"
	"bytes"
	"compress/flate"
	"compress/gzip"
	"encoding/csv"
	"errors"
	"io"
	"slices"
	"strings"
)

// unpacked is the text of a file to import: unzipped where it is gzipped (RFC 1952), a guarded CSV without its guards. lines says that
// it is JSON Lines. Its name, where it has one, stays.
func unpacked(in io.Reader) (_ io.Reader, lines bool, err error) {
	name := ""
	if f, ok := in.(interface{ Name() string }); ok {
		name = f.Name()
	}
	const most = 64 << 10 // far more than a header row
	text := bufio.NewReaderSize(in, most)
	if mark, _ := text.Peek(2); string(mark) == "\x1f\x8b" {
		z, err := gzip.NewReader(text)
		if err != nil {
			return nil, false, damagedZip(err)
		}
		text = bufio.NewReaderSize(unzipping{z}, most)
	}
	start, err := text.Peek(most)
	if err != nil && err != io.EOF {
		return nil, false, err
	}
	var out io.Reader = text
	bare := bytes.TrimPrefix(start, []byte("\ufeff"))
	lines = bytes.HasPrefix(bare, []byte("{"))
	if first, _, _ := bytes.Cut(bare, []byte("\n")); !lines && isGuarded(string(first)) {
		_, _ = text.Discard(len(start) - len(bare)) // it was peeked at
		out = recast(text, unguardTexts)
	}
	if name == "" {
		return out, lines, nil
	}
	return namedReader{out, name}, lines, nil
}

// isGuarded is whether a header row has the column that says what is guarded.
func isGuarded(header string) bool {
	cells, err := csv.NewReader(strings.NewReader(header)).Read()
	return err == nil && slices.ContainsFunc(cells, func(s string) bool { return strings.TrimSpace(s) == guardedColumn })
}

type namedReader struct {
	io.Reader
	name string
}

func (n namedReader) Name() string { return n.name }

// unzipping says of gzip's errors what to do.
type unzipping struct{ io.Reader }

func (u unzipping) Read(p []byte) (int, error) {
	n, err := u.Reader.Read(p)
	return n, damagedZip(err)
}

func damagedZip(err error) error {
	var corrupt flate.CorruptInputError
	if errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, gzip.ErrChecksum) || errors.Is(err, gzip.ErrHeader) || errors.As(err, &corrupt) {
		return errors.New("it is gzipped and damaged or cut short; copy it again")
	}
	return err
}

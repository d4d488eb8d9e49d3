package scpi

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"strings"
)

var (
	errTooLong  = errors.New("the reply is longer than allowed") // beyond Options.MaxReply
	errNotBlock = errors.New("not a block")
)

// ReadBlock reads one arbitrary block from r, after any blanks and line ends before it, and takes no
// byte beyond it except the line feed that ends an indefinite one.
//
//	#3256<256 bytes>     definite: a digit n other than 0, n digits that are a byte count, the bytes
//	#0<bytes><LF>        indefinite: ends at the first line feed, so it cannot carry one
//
// A definite block is read by its count, whatever the bytes are, straight into one slice made for it. A count
// above limit is an error before anything is read, so a count that lies costs no more than limit bytes. A cut-off
// block gives what came with io.ErrUnexpectedEOF or the reader's error; what is no block gives what was taken of
// it with an error that says so. IEEE 488.2, 8.7.9 and 8.7.10.
func ReadBlock(r *bufio.Reader, limit int) ([]byte, error) {
	in, err := openBlock(r)
	if err != nil {
		return []byte(in.head), err
	}
	return readAll(in, in.size, limit, nil)
}

// readAll keeps a reply of size bytes, -1 for one of unknown length, in room where it is large enough.
func readAll(r io.Reader, size int64, limit int, room []byte) ([]byte, error) {
	if size > int64(limit) {
		return nil, fmt.Errorf("%w: a block of %d bytes, the most is %d", errTooLong, size, limit)
	}
	if size >= 0 {
		if int64(cap(room)) < size {
			room = make([]byte, size)
		}
		n, err := io.ReadFull(r, room[:size])
		return room[:n], err
	}
	b, err := io.ReadAll(io.LimitReader(r, int64(limit)+1))
	if err == nil && len(b) > limit {
		return b[:limit], fmt.Errorf("%w: the most is %d bytes", errTooLong, limit)
	}
	return b, err
}

// skipBlanks gives the first byte that is neither a blank nor a line end, nor the NUL that some serial
// adapters send when they are opened, and the first few bytes it skipped.
func skipBlanks(r *bufio.Reader) (first byte, skipped string, err error) {
	for {
		b, err := r.ReadByte()
		if err != nil || b != ' ' && b != '\t' && b != '\r' && b != '\n' && b != 0 {
			return b, skipped, err
		}
		if len(skipped) < 80 {
			skipped += string([]byte{b})
		}
	}
}

// readLine reads on after head until one of the bytes in ends, which it takes and drops.
func readLine(r *bufio.Reader, limit int, head []byte, ends string) ([]byte, error) {
	line := head
	for {
		b, err := r.ReadByte()
		if err != nil {
			return line, err
		}
		if strings.IndexByte(ends, b) >= 0 {
			return line, nil
		}
		if len(line) >= limit {
			return line, fmt.Errorf("%w: the most is %d bytes", errTooLong, limit)
		}
		line = append(line, b)
	}
}

// midway turns the end of the stream into one that came too early.
func midway(err error) error {
	if err == io.EOF {
		return io.ErrUnexpectedEOF
	}
	return err
}

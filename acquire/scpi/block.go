package scpi

import (
	"bufio"
	"bytes"
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
// A definite block is read by its count, whatever the bytes are. A count above limit is an error before
// anything is read. A cut-off block gives what came with io.ErrUnexpectedEOF or the reader's error; what
// is no block gives what was taken of it with an error that says so. IEEE 488.2, 8.7.9 and 8.7.10.
func ReadBlock(r *bufio.Reader, limit int) ([]byte, error) {
	head, err := skipBlanks(r)
	if err != nil {
		return nil, err
	}
	if head != '#' {
		return []byte{head}, fmt.Errorf("%w: it does not begin with #", errNotBlock)
	}
	n, err := r.ReadByte()
	if err != nil {
		return []byte{head}, midway(err)
	}
	if n == '0' {
		line, err := readLine(r, limit, nil, "\n")
		return line, midway(err)
	}
	taken := []byte{head, n}
	if n < '1' || n > '9' {
		return taken, fmt.Errorf("%w: %q after # is not a digit", errNotBlock, n)
	}
	count := 0
	for range n - '0' {
		d, err := r.ReadByte()
		if err != nil {
			return taken, midway(err)
		}
		taken = append(taken, d)
		if !isDigit(d) {
			return taken, fmt.Errorf("%w: %q in its byte count is not a digit", errNotBlock, d)
		}
		count = count*10 + int(d-'0')
	}
	if count > limit {
		return taken, fmt.Errorf("%w: a block of %d bytes, the most is %d", errTooLong, count, limit)
	}
	var b bytes.Buffer // grows with what comes, not with what the peer promises
	_, err = io.CopyN(&b, r, int64(count))
	return b.Bytes(), midway(err)
}

// skipBlanks gives the first byte that is neither a blank nor a line end, nor the NUL that some serial
// adapters send when they are opened.
func skipBlanks(r *bufio.Reader) (byte, error) {
	for {
		b, err := r.ReadByte()
		if err != nil || b != ' ' && b != '\t' && b != '\r' && b != '\n' && b != 0 {
			return b, err
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

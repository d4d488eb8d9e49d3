package scpi

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
)

// incoming is the body of one reply, as it comes: the bytes of a block, or a line's. It ends with io.EOF where the
// body does.
type incoming struct {
	r    *bufio.Reader
	head string // "#42000": what stands before the body; of a line, its beginning, for a quote
	size int64  // bytes the count promises; -1: the body ends at one of the bytes in ends
	ends string
	got  int64 // bytes so far
	done bool
	err  error // the link's, where it failed before the end
}

// openBlock reads the head of a block. With an error, the incoming has what was taken of it.
func openBlock(r *bufio.Reader) (*incoming, error) {
	in := &incoming{r: r}
	first, _, err := skipBlanks(r)
	if err != nil {
		return in, err
	}
	in.head = string([]byte{first})
	if first != '#' {
		return in, fmt.Errorf("%w: it does not begin with #", errNotBlock)
	}
	return in, in.count()
}

// openText reads up to the body of a text reply: a line, or a block for an instrument that wraps its text in one.
func openText(r *bufio.Reader) (*incoming, error) {
	in := &incoming{r: r, size: -1, ends: "\r\n"}
	first, _, err := skipBlanks(r)
	if err != nil {
		return in, err
	}
	if first == '#' {
		in.head = "#"
		return in, in.count()
	}
	return in, r.UnreadByte()
}

// count reads what follows the # of a block's head.
func (in *incoming) count() error {
	n, err := in.r.ReadByte()
	if err != nil {
		return midway(err)
	}
	in.head += string([]byte{n})
	if n == '0' {
		in.size, in.ends = -1, "\n"
		return nil
	}
	if !isDigit(n) {
		return fmt.Errorf("%w: %q after # is not a digit", errNotBlock, n)
	}
	size := int64(0)
	for range n - '0' {
		d, err := in.r.ReadByte()
		if err != nil {
			return midway(err)
		}
		in.head += string([]byte{d})
		if !isDigit(d) {
			return fmt.Errorf("%w: %q in its byte count is not a digit", errNotBlock, d)
		}
		size = size*10 + int64(d-'0')
	}
	in.size = size
	return nil
}

// Read gives the next bytes. A piece larger than the buffer of r goes from the link straight into p.
func (in *incoming) Read(p []byte) (n int, err error) {
	switch {
	case in.err != nil:
		return 0, in.err
	case in.done || in.size >= 0 && in.got == in.size:
		return 0, io.EOF
	case len(p) == 0:
		return 0, nil
	case in.size >= 0:
		n, err = in.r.Read(p[:min(int64(len(p)), in.size-in.got)])
	default:
		n, err = in.line(p)
	}
	in.got += int64(n)
	if err != nil {
		in.err = midway(err)
		return n, in.err
	}
	if n == 0 && in.done {
		return 0, io.EOF
	}
	return n, nil
}

// line reads on to one of the bytes in ends, which it takes and drops.
func (in *incoming) line(p []byte) (int, error) {
	if _, err := in.r.Peek(1); err != nil {
		return 0, err
	}
	piece, _ := in.r.Peek(min(len(p), in.r.Buffered()))
	taken := len(piece)
	if end := bytes.IndexAny(piece, in.ends); end >= 0 {
		piece, taken, in.done = piece[:end], end+1, true
	}
	n := copy(p, piece)
	in.r.Discard(taken)
	if room := 60 - len(in.head); room > 0 {
		in.head += string(piece[:min(n, room)])
	}
	return n, nil
}

// progress says how much of the body had come, for an error.
func (in *incoming) progress() string {
	if in.size < 0 {
		return fmt.Sprintf("%d bytes of it had come", in.got)
	}
	return fmt.Sprintf("%d of the %d bytes that its count promises had come", in.got, in.size)
}

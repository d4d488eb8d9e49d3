package acquire

import (
	"bufio"
	"bytes"
	"errors"
	"io"

	"ringbook/acquire/scpi"
)

// longestNumber is the most bytes that one number in text may take, blanks and line ends included.
const longestNumber = 4096

// text reads numbers with commas between. A comma behind the last is common practice, and let pass.
func (d *decoder) text(body io.Reader) error {
	in := bufio.NewScanner(body)
	in.Buffer(nil, longestNumber)
	in.Split(func(data []byte, end bool) (int, []byte, error) {
		if i := bytes.IndexByte(data, ','); i >= 0 {
			return i + 1, data[:i], nil
		}
		if end && len(bytes.Trim(data, " \t\r\n")) > 0 {
			return len(data), data, nil
		}
		if end {
			return len(data), nil, nil
		}
		return 0, nil, nil
	})
	for in.Scan() {
		v, err := scpi.ParseNumber(in.Text())
		switch {
		case errors.Is(err, scpi.ErrNoReading):
			return unfit("check whether the trace has gaps or leaves the screen", "sample %d is %v", len(d.volts)+1, err)
		case err != nil:
			return unfit(checkFormat, "sample %d is %s, which is not a number", len(d.volts)+1, clip(in.Text()))
		case len(d.volts) == mostSamples:
			return errTooMany
		}
		if v = d.volt(v); beyond(v) {
			return errBeyond
		}
		d.volts = append(d.volts, v)
	}
	switch err := in.Err(); {
	case errors.Is(err, bufio.ErrTooLong):
		return unfit(checkFormat, "sample %d does not end: no comma in %d bytes", len(d.volts)+1, longestNumber)
	case err != nil:
		return err
	case len(d.volts) == 0:
		return errEmpty
	}
	return d.checkPoints(len(d.volts))
}

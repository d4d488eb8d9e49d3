package acquire

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"math/bits"
	"slices"
)

// mostSamples is the most that are taken of one capture: half a gigabyte of them.
const mostSamples = 1 << 26

// decoder makes voltages of samples as they come, and keeps nothing else of them.
type decoder struct {
	format Format
	order  ByteOrder
	calibration
	volts []float64
	table [256]float64 // the voltage of each byte, where a sample is one
	set   uint16       // every bit that was ever set in a 16-bit code
}

const checkFormat = "check format in the rig file, and what the instrument is set to send"

// decode reads the samples of one reply of size bytes; -1: it does not say how many.
func (d *decoder) decode(body io.Reader, size int64) error {
	if d.format == ASCII {
		return d.text(body)
	}
	width := int64(d.format.width())
	n := size / width
	switch {
	case size < 0:
		return unfit("set the instrument to blocks with a byte count", "an indefinite block ends at the first line feed, which may be a sample")
	case size == 0:
		return errEmpty
	case size%width != 0:
		return unfit(checkFormat, "%d bytes are no whole number of %s samples, which have %d bytes each", size, d.format, width)
	case n > mostSamples:
		return errTooMany
	}
	if err := d.checkPoints(int(n)); err != nil {
		return err
	}
	if d.format.codes() && (beyond(d.volt(math.MinInt16)) || beyond(d.volt(math.MaxUint16))) {
		return errBeyond
	}
	d.volts = make([]float64, 0, min(n, 1<<24)) // what the count says beyond is believed as it comes
	d.tabulate()
	buf := make([]byte, min(size, 64<<10))
	for left := size; left > 0; {
		piece := buf[:min(left, int64(len(buf)))]
		if _, err := io.ReadFull(body, piece); err != nil {
			return err
		}
		left -= int64(len(piece))
		if room := len(piece) / int(width); cap(d.volts)-len(d.volts) < room {
			d.volts = slices.Grow(d.volts, min(int(n), 2*cap(d.volts))-len(d.volts))
		}
		if err := d.append(piece); err != nil {
			return err
		}
	}
	return nil
}

// append puts the samples of one piece behind the others. There is room for them.
func (d *decoder) append(piece []byte) error {
	first := len(d.volts)
	d.volts = d.volts[:first+len(piece)/d.format.width()]
	out := d.volts[first:]
	var order binary.ByteOrder = binary.BigEndian
	if d.order == Little {
		order = binary.LittleEndian
	}
	switch d.format {
	case Int8, Uint8:
		for i := range out {
			out[i] = d.table[piece[i]]
		}
	case Int16:
		for i := range out {
			code := order.Uint16(piece[2*i:])
			d.set |= code
			out[i] = d.volt(float64(int16(code)))
		}
	case Uint16:
		for i := range out {
			code := order.Uint16(piece[2*i:])
			d.set |= code
			out[i] = d.volt(float64(code))
		}
	case Float32:
		for i := range out {
			v := float64(math.Float32frombits(order.Uint32(piece[4*i:])))
			if !(math.Abs(v) < noSample) {
				return unfit("check byte_order in the rig file, and whether the trace has gaps or leaves the screen", "sample %d is %g", first+i+1, v)
			}
			if out[i] = d.volt(v); beyond(out[i]) {
				return errBeyond
			}
		}
	}
	return nil
}

// tabulate gives each byte its voltage, where a sample is one byte.
func (d *decoder) tabulate() {
	for b := range d.table {
		if d.format == Int8 {
			d.table[b] = d.volt(float64(int8(b)))
		} else {
			d.table[b] = d.volt(float64(b))
		}
	}
}

// noSample is the size from which a number stands for none: SCPI's infinity in single precision. Package scpi does the
// same for numbers in text.
const noSample = 9.9e37 * (1 - 1e-6)

// codesPerStep is how many codes the converter's step is. An 8-bit converter's codes often stand in the upper half of 16-bit
// samples.
func (d *decoder) codesPerStep() float64 {
	if d.set == 0 {
		return 1
	}
	return float64(int(1) << bits.TrailingZeros16(d.set))
}

// checkPoints compares the samples there are with what the preamble said.
func (d *decoder) checkPoints(n int) error {
	if math.IsNaN(d.points) || d.points == float64(n) {
		return nil
	}
	return unfit("check format and preamble_fields in the rig file, and that nobody else reads the instrument",
		"%d samples of %s came, and the preamble promised %.0f points", n, d.format, d.points)
}

var (
	errEmpty   = unfit("have it capture first: give take in the rig file, and check its trigger", "there are no samples in it")
	errBeyond  = unfit("check the scaling in the rig file", "its samples come out beyond all numbers")
	errTooMany = unfit("have the instrument send fewer points", "more than %d samples", mostSamples)
)

// beyond says whether a voltage is none.
func beyond(v float64) bool { return !(math.Abs(v) <= math.MaxFloat64) }

// clip quotes the beginning of a text.
func clip(s string) string {
	if len(s) > 40 {
		return fmt.Sprintf("%q...", s[:40])
	}
	return fmt.Sprintf("%q", s)
}

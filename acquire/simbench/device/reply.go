package device

import (
	"fmt"
	"math"
	"strconv"
)

// What stands for a value that is none: SCPI-1999 volume 1, 7.2.1.
const (
	infinity    = "9.9E+37"
	negInfinity = "-9.9E+37"
	notANumber  = "9.91E+37"
)

// NR3 writes a number as a reply, to the given significant digits; infinities and NaN as the standard's
// stand-ins.
func NR3(v float64, digits int) string {
	switch {
	case math.IsNaN(v):
		return notANumber
	case math.IsInf(v, 1):
		return infinity
	case math.IsInf(v, -1):
		return negInfinity
	}
	return strconv.FormatFloat(v, 'E', max(digits-1, 1), 64)
}

// Block writes bytes as definite length arbitrary block response data (IEEE 488.2, 8.7.9).
func Block(data []byte) string {
	n := strconv.Itoa(len(data))
	return fmt.Sprintf("#%d%s%s", len(n), n, data)
}

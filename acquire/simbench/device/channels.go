package device

import (
	"bytes"
	"strconv"
	"strings"
)

// Bounds of a channel list, so that a few bytes cannot ask for a great deal.
const (
	highestChannel = 9999
	mostChannels   = 1000
)

// list reads an expression in parentheses. Channel lists are the only ones there are.
func (s *scanner) list() (Arg, error) {
	end := bytes.IndexByte(s.rest, ')')
	if end < 0 {
		return Arg{}, Errorf(-171, "no closing parenthesis")
	}
	text := string(s.rest[:end+1])
	s.rest = s.rest[end+1:]
	return Arg{kind: listArg, text: text}, nil
}

// Channels are the channels that a list names, in its order, (@1,3:5) being 1, 3, 4 and 5: SCPI-1999 volume 1, 8.3.2,
// from memory; of one dimension, and without module names. It has 1 to 1000 of them, each 1 to 9999.
func (a Arg) Channels() ([]int, error) {
	if a.kind != listArg {
		return nil, Errorf(-104, "%s where a channel list such as (@1,3:5) should be", clip([]byte(a.text)))
	}
	inner, ok := strings.CutPrefix(strings.Trim(a.text[1:len(a.text)-1], " \t"), "@")
	if !ok {
		return nil, Errorf(-171, "%s is no channel list such as (@1,3:5)", clip([]byte(a.text)))
	}
	var out []int
	for part := range strings.SplitSeq(inner, ",") {
		low, high, isRange := strings.Cut(part, ":")
		first, err := channel(low)
		if err != nil {
			return nil, err
		}
		last := first
		if isRange {
			if last, err = channel(high); err != nil {
				return nil, err
			}
		}
		step := 1
		if last < first {
			step = -1
		}
		for n := first; ; n += step {
			if len(out) == mostChannels {
				return nil, Errorf(-223, "a list may name %d channels", mostChannels)
			}
			if out = append(out, n); n == last {
				break
			}
		}
	}
	return out, nil
}

func channel(text string) (int, error) {
	n, err := strconv.ParseUint(strings.Trim(text, " \t"), 10, 31)
	switch {
	case err != nil:
		return 0, Errorf(-171, "%s is no channel", strconv.Quote(clip([]byte(text))))
	case n < 1 || n > highestChannel:
		return 0, Errorf(-222, "channel %d: it must lie in 1 to %d", n, highestChannel)
	}
	return int(n), nil
}

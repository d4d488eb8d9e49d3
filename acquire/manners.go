package acquire

import (
	"fmt"
	"strings"
	"time"

	"ringbook/snubber"
)

// manners sets how the instrument is spoken to, or says which key of the file is wrong.
func (f instrumentFile) manners(in *Instrument) (key string, err error) {
	if f.Timeout != nil {
		if in.Timeout, err = duration(*f.Timeout, 1); err != nil {
			return "timeout", err
		}
	}
	if f.Terminator != nil {
		end, ok := map[string]string{"lf": "\n", "crlf": "\r\n", "cr": "\r"}[*f.Terminator]
		if !ok {
			return "terminator", fmt.Errorf("%q: it must be lf, crlf or cr", *f.Terminator)
		}
		in.Terminator = end
	}
	if f.Pace != nil {
		if in.Pace, err = duration(*f.Pace, 0); err != nil {
			return "pace", err
		}
	}
	if f.Prompt != nil {
		if in.Prompt = strings.Trim(*f.Prompt, " "); in.Prompt == "" {
			return "prompt", fmt.Errorf("%q: give the characters that it writes, or take the key out", *f.Prompt)
		}
	}
	in.Echo = f.Echo
	if f.Reopen != nil {
		if in.Reopen, err = duration(*f.Reopen, 0); err != nil {
			return "reopen", err
		}
		if in.Reopen == 0 {
			in.Reopen = -1
		}
	}
	// A self-test may switch an output, or what a relay card holds.
	in.NoSelfTest = f.Output != nil || f.Fit != nil
	if f.SelfTest != nil {
		in.NoSelfTest = !*f.SelfTest
	}
	if f.Follows != nil && *f.Follows != "measure-tree" {
		return "follows", fmt.Errorf("%q: it must be measure-tree, for an instrument that knows the MEASure tree of SCPI-1999; leave it out for any other, and give each reading its query", *f.Follows)
	}
	return "", nil
}

// duration reads a time of at least so many nanoseconds.
func duration(text string, least time.Duration) (time.Duration, error) {
	d, err := time.ParseDuration(text)
	switch {
	case (err != nil || d < least) && least > 0:
		return 0, fmt.Errorf("%q: write a time longer than nothing with its unit, such as 500ms or 8s", text)
	case err != nil || d < least:
		return 0, fmt.Errorf("%q: write a time with its unit, such as 500ms or 8s, or 0s for none", text)
	}
	return d, nil
}

// mostPace is the longest an instrument may ask for between two messages.
const mostPace = time.Minute

// checkManners gives the first of these fields that cannot be, by its key in the file.
func (in Instrument) checkManners() (key string, err error) {
	if in.Pace < 0 || in.Pace > mostPace {
		return "pace", fmt.Errorf("%s: it must be nothing to %s", in.Pace, mostPace)
	}
	for _, c := range in.Prompt {
		if c < ' ' || c > 0x7e {
			return "prompt", fmt.Errorf("%q: it must be plain ASCII without line ends", in.Prompt)
		}
	}
	if in.Prompt != strings.Trim(in.Prompt, " ") || strings.Contains("0123456789+-.#\"'", in.Prompt[:min(1, len(in.Prompt))]) && in.Prompt != "" {
		return "prompt", fmt.Errorf("%q: it must begin with no blank, and with nothing that a reply may begin with", in.Prompt)
	}
	return "", nil
}

// measureTree gives the query for a quantity in the MEASure tree: SCPI-1999, Volume 2, chapter 3, MEASure, and its
// signal-oriented functions [from memory].
func measureTree(q snubber.Quantity) (string, error) {
	query, ok := map[snubber.Quantity]string{
		snubber.RingHz:      "MEASure:FREQuency?",
		snubber.SwitchingHz: "MEASure:FREQuency?",
		snubber.PeakV:       "MEASure:VOLTage:MAXimum?",
		snubber.BusV:        "MEASure:VOLTage:DC?",
		snubber.CurrentA:    "MEASure:CURRent:DC?",
		snubber.SupplyA:     "MEASure:CURRent:DC?",
		snubber.TempC:       "MEASure:TEMPerature?",
	}[q]
	if !ok && q == snubber.DecayS {
		return "", fmt.Errorf("its query is missing: the MEASure tree has none for a decay; give the instrument's own")
	}
	return query, nil // of what is no quantity, Check says so
}

// outputFile is [instrument.NAME.output].
type outputFile struct {
	On     any     `toml:"on"`
	Off    any     `toml:"off"`
	State  *string `toml:"state"`
	Settle *string `toml:"settle"`
}

// output makes a description of it, or says which key is wrong.
func (f outputFile) output() (o BusSwitch, key string, err error) {
	if o.On, err = messages(f.On); err != nil {
		return o, "on", err
	}
	if o.Off, err = messages(f.Off); err != nil {
		return o, "off", err
	}
	if f.State != nil {
		if o.State = *f.State; o.State == "" {
			return o, "state", fmt.Errorf("it is empty: give the query, or take the key out")
		}
	}
	if f.Settle != nil {
		if o.Settle, err = duration(*f.Settle, 0); err != nil {
			return o, "settle", err
		}
	}
	return o, "", nil
}

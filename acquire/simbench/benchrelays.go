package simbench

import (
	"fmt"
	"math"
	"strings"

	"ringbook/acquire/simbench/device"
)

// fiftyCapacitors are those of the default relay card: 22 pF to 2.4 nF, two decades of the series E24 of IEC 60063.
func fiftyCapacitors() (list []float64) {
	e24 := []float64{10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91}
	for i := 8; len(list) < 50; i++ {
		list = append(list, math.Round(e24[i%24]*math.Pow10(i/24))/1e12)
	}
	return list
}

func checkRelays(list []float64) error {
	if len(list) > 1000 {
		return fmt.Errorf("relay card of %d channels: it may have 1000", len(list))
	}
	for i, c := range list {
		if !(c > 0 && c <= mostFarads) {
			return fmt.Errorf("relay channel %d with %g F: it must be positive and at most %g", i+1, c, mostFarads)
		}
	}
	return nil
}

// Relays are the capacitors of the relay card, F, by what is printed on them, channel 1 first.
func (b *Bench) Relays() []float64 { return append([]float64(nil), b.model.cfg.Relays...) }

// acrossF is what the closed relays put across the switch, F: the actual values of their capacitors, which are those
// of the same box as one that is soldered in. They come besides what is soldered, and have no series resistance.
func (b *Bench) acrossF() (sum float64) {
	for i, nominal := range b.model.cfg.Relays {
		if b.closed[i] {
			sum += b.model.cfg.Parts.actual(Network{Kind: C, C: nominal}).C
		}
	}
	return sum
}

// newRelays makes the relay card, each of whose channels switches one capacitor across the switch.
//
//	ROUTe:CLOSe (@2,4:6)    ROUTe:CLOSe? (@2,4:6)     1 for each that is closed, else 0
//	ROUTe:OPEN (@2,4:6)     ROUTe:OPEN? (@2,4:6)      1 for each that is open, else 0
//	ROUTe:OPEN:ALL          ROUTe:CLOSe:STATe?        a list of those closed
//	RELays:CAPacitance? (@2,4:6)                      what is printed on each, farad
//
// ROUTe is that of SCPI-1999, Volume 2, chapter 17, from memory; a list with a channel that the card does not have moves
// none.
func (b *Bench) newRelays() (*device.Instrument, error) {
	openAll := func() {
		b.mu.Lock()
		defer b.mu.Unlock()
		b.route(make([]bool, len(b.closed)))
	}
	state := func(value func(i int) string) func([]device.Arg) (string, error) {
		return b.channels(func(list []int) string {
			out := make([]string, len(list))
			for k, i := range list {
				out[k] = value(i)
			}
			return strings.Join(out, ",")
		})
	}
	is := map[bool]string{true: "1", false: "0"}
	return device.New("RINGBOOK,SIMULATED RELAY CARD,0,1", openAll, []device.Command{
		{Header: "ROUTe:CLOSe", Min: 1, Max: 1, Do: b.channels(b.move(true))},
		{Header: "ROUTe:OPEN", Min: 1, Max: 1, Do: b.channels(b.move(false))},
		{Header: "ROUTe:OPEN:ALL", Do: func([]device.Arg) (string, error) { openAll(); return "", nil }},
		{Header: "ROUTe:CLOSe?", Min: 1, Max: 1, Do: state(func(i int) string { return is[b.closed[i]] })},
		{Header: "ROUTe:OPEN?", Min: 1, Max: 1, Do: state(func(i int) string { return is[!b.closed[i]] })},
		{Header: "ROUTe:CLOSe:STATe?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			var list []string
			for i, on := range b.closed {
				if on {
					list = append(list, fmt.Sprint(i+1))
				}
			}
			return "(@" + strings.Join(list, ",") + ")", nil
		}},
		{Header: "RELays:CAPacitance?", Min: 1, Max: 1, Do: state(func(i int) string { return device.NR3(b.model.cfg.Relays[i], 6) })},
	})
}

// channels makes what does something with a list of channels, as indexes that exist.
func (b *Bench) channels(do func(list []int) string) func([]device.Arg) (string, error) {
	return func(args []device.Arg) (string, error) {
		list, err := args[0].Channels()
		if err != nil {
			return "", err
		}
		b.mu.Lock()
		defer b.mu.Unlock()
		for k, n := range list {
			if n > len(b.closed) {
				return "", device.Errorf(-222, "channel %d of %d", n, len(b.closed))
			}
			list[k] = n - 1
		}
		return do(list), nil
	}
}

// move opens or closes the channels of a list.
func (b *Bench) move(closed bool) func([]int) string {
	return func(list []int) string {
		next := append([]bool(nil), b.closed...)
		for _, i := range list {
			next[i] = closed
		}
		b.route(next)
		return ""
	}
}

// route moves the relays, all of them at once.
func (b *Bench) route(next []bool) {
	for i := range next {
		if next[i] != b.closed[i] {
			b.touch()
			break
		}
	}
	b.closed = next
}

package simbench

import (
	"fmt"
	"strings"
	"time"

	"ringbook/acquire/simbench/device"
)

// Trouble lets something go wrong with the named instrument; see device.Trouble for what there is.
func (b *Bench) Trouble(name string, t device.Trouble) error {
	in, ok := b.instruments[name]
	if !ok {
		return fmt.Errorf("trouble with %q: the instruments are %v", name, Names())
	}
	if err := in.Trouble(t); err != nil {
		return fmt.Errorf("trouble with the %s: %w", name, err)
	}
	return nil
}

// Troubles is how many troubles have happened to the named instrument so far, and how many wait.
func (b *Bench) Troubles(name string) (happened, waiting int) {
	if in, ok := b.instruments[name]; ok {
		return in.Troubles()
	}
	return 0, 0
}

// newTrouble makes what lets things go wrong. It has a line of its own, so that nothing of it stands between a client
// and the instrument in trouble. NAME is an instrument's name; n says which message or reply of it, 1 being the next.
//
//	TROuble:DROP NAME[,n[,seconds]]     its connections end: at once (0, when left out) or at message n; and new ones end
//	                                    at once for so long
//	TROuble:SILence NAME,seconds[,n]    what it is sent is thrown away for so long: at once, or from message n
//	TROuble:DELay NAME,seconds[,n]      reply n comes so much later
//	TROuble:CUT NAME[,n]                reply n ends in its middle
//	TROuble:CUT:BLOCk NAME[,n]          the same of block n
//	TROuble:GARBage NAME[,n]            bytes that mean nothing come in place of reply n
//	TROuble:LINE NAME,'text'[,n]        a line nobody asked for: at once, or before reply n
//	TROuble:STALe NAME[,n]              reply n is held back and comes with the next, before it
//	TROuble:ERRor NAME,code[,'text']    an entry in its error queue
//	TROuble:CLEar                       forgets what has not happened yet, and ends silence and refusals
//	TROuble:COUNt? NAME                 how many have happened, and how many wait
func (b *Bench) newTrouble() (*device.Instrument, error) {
	return device.New("RINGBOOK,SIMULATED TROUBLE,0,1", nil, []device.Command{
		b.cause("TROuble:DROP", device.Drop, count, seconds),
		b.cause("TROuble:SILence", device.Silence, seconds, count),
		b.cause("TROuble:DELay", device.Delay, seconds, count),
		b.cause("TROuble:CUT", device.Cut, count),
		b.cause("TROuble:CUT:BLOCk", device.CutBlock, count),
		b.cause("TROuble:GARBage", device.Garbage, count),
		b.cause("TROuble:LINE", device.Line, text, count),
		b.cause("TROuble:STALe", device.Stale, count),
		b.cause("TROuble:ERRor", device.Entry, code, text),
		{Header: "TROuble:CLEar", Do: func([]device.Arg) (string, error) {
			for _, name := range Names() {
				b.instruments[name].ClearTroubles()
			}
			return "", nil
		}},
		{Header: "TROuble:COUNt?", Min: 1, Max: 1, Do: func(args []device.Arg) (string, error) {
			name, err := b.named(args[0])
			if err != nil {
				return "", err
			}
			happened, waiting := b.Troubles(name)
			return fmt.Sprintf("%d,%d", happened, waiting), nil
		}},
	})
}

// cause makes a command that names an instrument and then fills in a trouble, one argument after another.
func (b *Bench) cause(header string, kind device.TroubleKind, fill ...func(*device.Trouble, device.Arg) error) device.Command {
	return device.Command{Header: header, Min: 1, Max: 1 + len(fill), Do: func(args []device.Arg) (string, error) {
		name, err := b.named(args[0])
		if err != nil {
			return "", err
		}
		t := device.Trouble{Kind: kind}
		for i, a := range args[1:] {
			if err := fill[i](&t, a); err != nil {
				return "", err
			}
		}
		if name == "trouble" {
			return "", device.Errorf(-221, "it is what is being spoken to")
		}
		if err := b.instruments[name].Trouble(t); err != nil {
			return "", device.Errorf(-222, "%v", err)
		}
		return "", nil
	}}
}

// named is the instrument that an argument names.
func (b *Bench) named(a device.Arg) (string, error) {
	word, err := a.Word()
	if err != nil {
		return "", err
	}
	name := strings.ToLower(word)
	if _, ok := b.instruments[name]; !ok {
		return "", device.Errorf(-224, "%s is none of the instruments %s", word, strings.Join(Names(), " "))
	}
	return name, nil
}

func count(t *device.Trouble, a device.Arg) error {
	n, err := whole(a)
	t.After = n
	return err
}

func code(t *device.Trouble, a device.Arg) error {
	n, err := whole(a)
	t.Code = n
	return err
}

func whole(a device.Arg) (int, error) {
	v, err := a.Number()
	if err != nil {
		return 0, err
	}
	if v != float64(int32(v)) {
		return 0, device.Errorf(-222, "%g is no whole number of a size that helps", v)
	}
	return int(v), nil
}

func seconds(t *device.Trouble, a device.Arg) error {
	v, err := a.Number()
	if err != nil {
		return err
	}
	if !(v >= 0 && v <= 3600) {
		return device.Errorf(-222, "%g s: it must lie in 0 to 3600", v)
	}
	t.For = time.Duration(v * float64(time.Second))
	return nil
}

func text(t *device.Trouble, a device.Arg) (err error) {
	t.Text, err = a.Text()
	return err
}

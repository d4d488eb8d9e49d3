package device

import (
	"bytes"
	"fmt"
	"slices"
	"sync"
	"time"
)

// TroubleKind says what goes wrong.
type TroubleKind string

// The kinds of trouble. Where After is 0, Drop, Silence and Line happen at once, and the others befall the next reply.
const (
	Drop     TroubleKind = "drop"     // the message is not run, and every connection ends; new ones end at once for For
	Silence  TroubleKind = "silence"  // from this message on, messages are thrown away unread for For
	Delay    TroubleKind = "delay"    // the reply comes later by For
	Cut      TroubleKind = "cut"      // the reply ends in its middle, and nothing follows
	CutBlock TroubleKind = "cutblock" // the same, but only replies that are a block count
	Garbage  TroubleKind = "garbage"  // Text, or bytes without meaning, come in place of the reply
	Line     TroubleKind = "line"     // a line that nobody asked for, Text, comes before the reply
	Stale    TroubleKind = "stale"    // the reply is held back and comes with the next, before it
	Entry    TroubleKind = "entry"    // the error queue gets an entry of Code and Text, at once
)

// Trouble is one thing that goes wrong on demand.
type Trouble struct {
	Kind TroubleKind
	// After says which it befalls, 1 being the next from now: of the messages that arrive for Drop and Silence, of the
	// replies for the others. All connections count together.
	After int
	For   time.Duration // of Drop, Silence and Delay
	Text  string        // of Garbage, Line and Entry
	Code  int           // of Entry
}

// meaningless is what Garbage sends: no text, no number, no block, and a line end inside.
const meaningless = "\x8f\x00\xfe#9\n\x07\xc3(~"

// mostTroubles and longestTrouble bound what may stand in wait.
const (
	mostTroubles   = 1000
	longestTrouble = time.Hour
)

// Check reports the first value that a trouble cannot have.
func (t Trouble) Check() error {
	kinds := []TroubleKind{Drop, Silence, Delay, Cut, CutBlock, Garbage, Line, Stale, Entry}
	timed := t.Kind == Silence || t.Kind == Delay
	switch {
	case !slices.Contains(kinds, t.Kind):
		return fmt.Errorf("trouble %q: there are %v", t.Kind, kinds)
	case t.After < 0:
		return fmt.Errorf("trouble %s after %d: it must be 0 or more", t.Kind, t.After)
	case t.For < 0 || t.For > longestTrouble, timed && t.For == 0:
		return fmt.Errorf("trouble %s for %v: it must be longer than nothing and at most %v", t.Kind, t.For, longestTrouble)
	case t.Kind == Entry && t.Code == 0:
		return fmt.Errorf("trouble %s of code 0: that is no error", t.Kind)
	}
	return nil
}

// ofMessages says whether the trouble counts messages, and not replies.
func (t Trouble) ofMessages() bool { return t.Kind == Drop || t.Kind == Silence }

// troubles is what goes wrong with one instrument, and whom it is in dialogue with. It is safe for concurrent use.
type troubles struct {
	mu        sync.Mutex
	waiting   []Trouble
	happened  int
	silent    time.Time // until then it is silent
	down      time.Time // until then it takes no connection
	dialogues map[*dialogue]bool
}

// Trouble lets something go wrong, now or when its message or reply comes.
func (in *Instrument) Trouble(t Trouble) error {
	if err := t.Check(); err != nil {
		return err
	}
	x := &in.troubles
	switch {
	case t.Kind == Entry:
		in.mu.Lock()
		in.status.raise(&Error{Code: t.Code, Detail: t.Text})
		in.mu.Unlock()
		x.count()
		return nil
	case t.After == 0 && t.Kind == Line:
		for _, d := range x.all() {
			d.write([]byte(t.Text + "\n"))
		}
		x.count()
		return nil
	}
	x.mu.Lock()
	defer x.mu.Unlock()
	if t.After == 0 && t.ofMessages() {
		x.begin(t)
		return nil
	}
	if len(x.waiting) == mostTroubles {
		return fmt.Errorf("%d troubles wait already", mostTroubles)
	}
	t.After = max(t.After, 1)
	x.waiting = append(x.waiting, t)
	return nil
}

// ClearTroubles forgets what has not happened yet, and ends silence and refusal.
func (in *Instrument) ClearTroubles() {
	x := &in.troubles
	x.mu.Lock()
	defer x.mu.Unlock()
	x.waiting, x.silent, x.down = nil, time.Time{}, time.Time{}
}

// Troubles is how many troubles have happened so far, and how many wait.
func (in *Instrument) Troubles() (happened, waiting int) {
	x := &in.troubles
	x.mu.Lock()
	defer x.mu.Unlock()
	return x.happened, len(x.waiting)
}

func (x *troubles) count() {
	x.mu.Lock()
	defer x.mu.Unlock()
	x.happened++
}

// begin starts a trouble of messages. x is locked.
func (x *troubles) begin(t Trouble) {
	x.happened++
	if t.Kind == Silence {
		x.silent = time.Now().Add(t.For)
		return
	}
	x.down = time.Now().Add(t.For)
	for d := range x.dialogues {
		d.stream.Close()
	}
}

// due counts one off every trouble that counts, and takes out those whose turn it is.
func (x *troubles) due(counts func(Trouble) bool) (due []Trouble) {
	kept := x.waiting[:0]
	for _, t := range x.waiting {
		if counts(t) {
			t.After--
		}
		if t.After > 0 {
			kept = append(kept, t)
			continue
		}
		due = append(due, t)
	}
	x.waiting = kept
	return due
}

// message counts a message that has arrived, and says whether it is to be run, and whether its dialogue is over.
func (x *troubles) message() (run, over bool) {
	x.mu.Lock()
	defer x.mu.Unlock()
	for _, t := range x.due(Trouble.ofMessages) {
		x.begin(t)
		over = over || t.Kind == Drop
	}
	return !over && !time.Now().Before(x.silent), over
}

// reply counts a reply, and gives what is to be sent in its place and how much later. held is what the dialogue holds
// back.
func (x *troubles) reply(out []byte, held *[]byte) (send []byte, late time.Duration) {
	x.mu.Lock()
	defer x.mu.Unlock()
	block := bytes.HasPrefix(out, []byte("#"))
	before := *held
	*held = nil
	for _, t := range x.due(func(t Trouble) bool { return !t.ofMessages() && (block || t.Kind != CutBlock) }) {
		x.happened++
		switch t.Kind {
		case Delay:
			late += t.For
		case Cut, CutBlock:
			out = out[:len(out)/2]
		case Garbage:
			if out = []byte(meaningless + "\n"); t.Text != "" {
				out = []byte(t.Text + "\n")
			}
		case Line:
			before = append(before, t.Text+"\n"...)
		case Stale:
			*held, out = append(*held, out...), nil
		}
	}
	return append(before, out...), late
}

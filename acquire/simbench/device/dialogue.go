package device

import (
	"io"
	"sync"
	"time"
)

// dialogue is one stream that the instrument answers on.
type dialogue struct {
	stream  io.ReadWriteCloser
	writing sync.Mutex // replies, and lines that nobody asked for
	held    []byte     // a reply that is held back; of the goroutine that serves
}

func (d *dialogue) write(p []byte) error {
	if len(p) == 0 {
		return nil
	}
	d.writing.Lock()
	defer d.writing.Unlock()
	_, err := d.stream.Write(p)
	return err
}

// join begins a dialogue; nil while the instrument takes none.
func (x *troubles) join(stream io.ReadWriteCloser) *dialogue {
	x.mu.Lock()
	defer x.mu.Unlock()
	if time.Now().Before(x.down) {
		return nil
	}
	if x.dialogues == nil {
		x.dialogues = map[*dialogue]bool{}
	}
	d := &dialogue{stream: stream}
	x.dialogues[d] = true
	return d
}

// Refuses says whether the instrument takes no connection for now, because of a Drop.
func (in *Instrument) Refuses() bool {
	x := &in.troubles
	x.mu.Lock()
	defer x.mu.Unlock()
	return time.Now().Before(x.down)
}

func (x *troubles) leave(d *dialogue) {
	x.mu.Lock()
	defer x.mu.Unlock()
	delete(x.dialogues, d)
}

func (x *troubles) all() (list []*dialogue) {
	x.mu.Lock()
	defer x.mu.Unlock()
	for d := range x.dialogues {
		list = append(list, d)
	}
	return list
}

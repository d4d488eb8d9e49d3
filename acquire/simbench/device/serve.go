package device

import (
	"bufio"
	"context"
	"errors"
	"io"
	"net"
	"sync"
	"time"
)

// longestMessage is how many bytes of a program message are kept, terminator included.
const longestMessage = 4096

// Serve answers the messages that arrive on a stream, until it ends or ctx is cancelled, and closes
// it. What goes wrong on demand (see Trouble) goes wrong here. A message without its line feed at the end of the stream is not run. A message longer than the
// input buffer is thrown away whole and noted as -363.
func (in *Instrument) Serve(ctx context.Context, stream io.ReadWriteCloser) error {
	stop := context.AfterFunc(ctx, func() { stream.Close() })
	defer func() {
		if stop() {
			stream.Close()
		}
	}()
	d := in.troubles.join(stream)
	if d == nil {
		return nil
	}
	defer in.troubles.leave(d)
	r := bufio.NewReaderSize(stream, longestMessage)
	for {
		line, err := r.ReadSlice('\n')
		if errors.Is(err, bufio.ErrBufferFull) {
			for errors.Is(err, bufio.ErrBufferFull) {
				_, err = r.ReadSlice('\n')
			}
			if err == nil {
				in.overrun()
				continue
			}
		}
		switch {
		case ctx.Err() != nil:
			return ctx.Err()
		case errors.Is(err, io.EOF):
			return nil
		case err != nil:
			return err
		}
		run, over := in.troubles.message()
		if over {
			return nil
		}
		if !run {
			continue
		}
		reply := in.Execute(line[:len(line)-1])
		if reply == nil {
			continue
		}
		send, late := in.troubles.reply(reply, &d.held)
		if late > 0 {
			select {
			case <-ctx.Done():
				return ctx.Err()
			case <-time.After(late):
			}
		}
		if err := d.write(send); err != nil {
			return err
		}
	}
}

// ServeListener answers every client that connects, each on its own, until ctx is cancelled, and
// closes the listener. It returns when the last client has been let go.
func (in *Instrument) ServeListener(ctx context.Context, ln net.Listener) error {
	var clients sync.WaitGroup
	defer clients.Wait()
	stop := context.AfterFunc(ctx, func() { ln.Close() })
	defer func() {
		if stop() {
			ln.Close()
		}
	}()
	for {
		conn, err := ln.Accept()
		if err != nil {
			if ctx.Err() != nil {
				return ctx.Err()
			}
			return err
		}
		// What ends one client's dialogue, its own fault or ours, is no matter of the others'.
		clients.Go(func() { _ = in.Serve(ctx, conn) })
	}
}

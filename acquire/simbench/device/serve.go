package device

import (
	"bufio"
	"context"
	"errors"
	"io"
	"net"
	"sync"
)

// longestMessage is how many bytes of a program message are kept, terminator included.
const longestMessage = 4096

// Serve answers the messages that arrive on a stream, until it ends or ctx is cancelled, and closes
// it. A message without its line feed at the end of the stream is not run. A message longer than the
// input buffer is thrown away whole and noted as -363.
func (in *Instrument) Serve(ctx context.Context, stream io.ReadWriteCloser) error {
	stop := context.AfterFunc(ctx, func() { stream.Close() })
	defer func() {
		if stop() {
			stream.Close()
		}
	}()
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
		if reply := in.Execute(line[:len(line)-1]); reply != nil {
			if _, err := stream.Write(reply); err != nil {
				return err
			}
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

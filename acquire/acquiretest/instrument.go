package acquiretest

import (
	"bufio"
	"io"
	"net"
	"strconv"
	"strings"
	"sync"
)

// Instrument answers program messages out of a table and keeps an error queue. Its methods may be
// called from several goroutines; its fields must be set before.
type Instrument struct {
	Identity string              // the answer to *IDN?
	Answers  map[string]string   // query as it will be sent, to reply
	Sequence map[string][]string // query to successive replies, which come before Answers
	Commands map[string]string   // command as it will be sent, to the queue entry it makes; "" for none

	mu    sync.Mutex
	queue []string
	heard []string
}

// Answer takes one program message without its terminator and gives the reply with its line feed, or ""
// where none is due. What the tables have not is -113, and no reply.
func (i *Instrument) Answer(message string) string {
	i.mu.Lock()
	defer i.mu.Unlock()
	switch message {
	case "*IDN?":
		return i.Identity + "\n"
	case "SYSTem:ERRor?":
		if len(i.queue) == 0 {
			return "0,\"No error\"\n"
		}
		entry := i.queue[0]
		i.queue = i.queue[1:]
		return entry + "\n"
	}
	i.heard = append(i.heard, message)
	if replies := i.Sequence[message]; len(replies) > 0 {
		i.Sequence[message] = replies[1:]
		return replies[0] + "\n"
	}
	if reply, ok := i.Answers[message]; ok {
		return reply + "\n"
	}
	entry, ok := i.Commands[message]
	if !ok {
		entry = `-113,"Undefined header"`
	}
	if entry != "" {
		i.queue = append(i.queue, entry)
	}
	return ""
}

// Heard lists the messages so far, without *IDN? and SYSTem:ERRor?.
func (i *Instrument) Heard() []string {
	i.mu.Lock()
	defer i.mu.Unlock()
	return append([]string(nil), i.heard...)
}

// Talk answers the program messages that come over rw, ended by LF or CR LF, until it fails or ends.
func Talk(rw io.ReadWriter, answer func(message string) string) {
	in := bufio.NewScanner(rw)
	for in.Scan() {
		message := strings.TrimRight(in.Text(), "\r")
		if message == "" {
			continue
		}
		reply := answer(message)
		if reply == "" {
			continue // an empty write would wait for a reader on some pipes
		}
		if _, err := io.WriteString(rw, reply); err != nil {
			return
		}
	}
}

// Serve answers on a free loopback port until the test ends and gives the address to open.
func Serve(t TB, answer func(message string) string) (address string) {
	t.Helper()
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Errorf("serve an instrument: %v", err)
		return ""
	}
	var mu sync.Mutex
	var conns []net.Conn
	ended := false
	var talks sync.WaitGroup
	talks.Go(func() {
		for {
			conn, err := listener.Accept()
			if err != nil {
				return
			}
			mu.Lock()
			conns = append(conns, conn)
			if ended {
				conn.Close()
			}
			mu.Unlock()
			talks.Go(func() {
				defer conn.Close()
				Talk(conn, answer)
			})
		}
	})
	t.Cleanup(func() {
		listener.Close()
		mu.Lock()
		ended = true
		for _, c := range conns {
			c.Close()
		}
		mu.Unlock()
		talks.Wait()
	})
	return "tcp://127.0.0.1:" + strconv.Itoa(listener.Addr().(*net.TCPAddr).Port)
}

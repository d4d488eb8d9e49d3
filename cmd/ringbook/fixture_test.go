package main

import (
	"bufio"
	"context"
	"database/sql"
	"fmt"
	"io"
	"math/rand/v2"
	"net"
	"os"
	"strconv"
	"strings"

	"ringbook/acquire/wire"

	"github.com/creack/pty"
	"github.com/rogpeppe/go-internal/testscript"
)

// rigOf reads one instrument at an address. It waits a short time only, so that silence does not hold the test up.
const rigOf = `[instrument.scope]
address = %q
timeout = "400ms"

[instrument.scope.reading.ring_hz]
query    = "MEASure:FREQuency?"
accuracy = { percent = 1 }
`

// faults are what an instrument can do when it is asked for the ring's frequency. "(close)" closes the link, a line
// feed ends a reply.
var faults = map[string]string{
	"sound":     "61.8E6\n",
	"unplugged": "(close)",
	"silent":    "",
	"half":      "61.8",
	"nonsense":  "READY\n",
	"garbled":   "\x00\xff\x1b[31m\n",
	"overrange": "9.91E37\n",
	"erring":    "61.8E6\n",
	"refusing":  "",
	"dumb":      "", // not even *IDN?
}

// instrument FAULT serves an instrument on a port of the loopback interface and writes rig.toml for it; what it is asked is in
// the file asked. With "refused" nothing listens at the address.
func instrument(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: instrument fault")
	}
	answer, known := faults[args[0]]
	if !known && args[0] != "refused" {
		ts.Fatalf("no such fault: %s", args[0])
	}
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	ts.Check(err)
	ts.Check(os.WriteFile(ts.MkAbs("rig.toml"), fmt.Appendf(nil, rigOf, "tcp://"+ln.Addr().String()), 0o600))
	if args[0] == "refused" {
		ts.Check(ln.Close())
		return
	}
	ts.Defer(func() { ln.Close() })
	asked, err := os.Create(ts.MkAbs("asked"))
	ts.Check(err)
	ts.Defer(func() { asked.Close() })
	go func() {
		for {
			conn, err := ln.Accept()
			if err != nil {
				return
			}
			go converse(io.TeeReader(conn, asked), conn, args[0], answer)
		}
	}()
}

func converse(in io.Reader, conn net.Conn, fault, answer string) {
	defer conn.Close()
	queue := `0,"No error"`
	for lines := bufio.NewScanner(in); lines.Scan(); {
		reply := ""
		switch line := strings.ToUpper(strings.TrimSpace(lines.Text())); {
		case fault == "dumb":
		case line == "*IDN?":
			reply = "Example Works,Scope 1,0001,1.0\n"
		case strings.HasPrefix(line, "SYST"):
			reply, queue = queue+"\n", `0,"No error"`
		case strings.HasPrefix(line, "MEAS"):
			if reply = answer; reply == "(close)" {
				return
			}
			switch fault {
			case "erring":
				queue = `-222,"Data out of range"`
			case "refusing":
				queue = `-113,"Undefined header"`
			}
		}
		if _, err := conn.Write([]byte(reply)); err != nil {
			return
		}
	}
}

// heldport makes a serial port that this test holds, and rig.toml for it.
func heldPort(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 0 {
		ts.Fatalf("usage: heldport")
	}
	near, far, err := pty.Open()
	ts.Check(err)
	ts.Defer(func() { near.Close(); far.Close() })
	address := "serial://" + far.Name()
	held, err := wire.Open(ts.Value(ctxKey{}).(context.Context), address)
	ts.Check(err)
	ts.Defer(func() { held.Close() })
	ts.Check(os.WriteFile(ts.MkAbs("rig.toml"), fmt.Appendf(nil, rigOf, address), 0o600))
}

// sql FILE STATEMENT runs a statement on an SQLite file as another program would, and prints the rows.
func sqlOn(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: sql file statement")
	}
	db, err := sql.Open("sqlite", ts.MkAbs(args[0]))
	ts.Check(err)
	defer db.Close()
	rows, err := db.Query(args[1])
	ts.Check(err)
	defer rows.Close()
	names, err := rows.Columns()
	ts.Check(err)
	for rows.Next() {
		cells, into := make([]any, len(names)), make([]any, len(names))
		for i := range cells {
			into[i] = &cells[i]
		}
		ts.Check(rows.Scan(into...))
		fmt.Fprintln(ts.Stdout(), cells...)
	}
	ts.Check(rows.Err())
}

// damage FILE overwrites a file behind its first 4096 bytes, as a failing disk would.
func damage(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: damage file")
	}
	data, err := os.ReadFile(ts.MkAbs(args[0]))
	ts.Check(err)
	rng := rand.New(rand.NewPCG(1, 2))
	for i := 4096; i < len(data); i++ {
		data[i] = byte(rng.Uint32())
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), data, 0o600))
}

// rows N prints the rows of that many trials as CSV, for a file too long to be written out.
func rowsCSV(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: rows number")
	}
	n, err := strconv.Atoi(args[0])
	ts.Check(err)
	f, err := os.Create(ts.MkAbs("rows.csv"))
	ts.Check(err)
	defer f.Close()
	ts.Check(writeRows(f, n))
}

package wire

import (
	"io/fs"
	"os"
	"strings"
	"syscall"
	"testing"

	"github.com/creack/pty"
	"go.bug.st/serial"
)

// A program that takes no advisory lock, but opens exclusively, is seen.
func TestExclusive(t *testing.T) {
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	defer master.Close()
	defer slave.Close()
	if exclusive(int(slave.Fd())) {
		t.Error("a fresh terminal is held exclusively")
	}
	port, err := serial.Open(slave.Name(), &serial.Mode{BaudRate: 9600})
	if err != nil {
		t.Fatal(err)
	}
	if !exclusive(int(slave.Fd())) {
		t.Error("a terminal opened exclusively is not seen to be")
	}
	port.Close()
}

// Root is never denied, so the sentence is tested without the system.
func TestPermissionSentence(t *testing.T) {
	a := Address{Device: "/dev/ttyUSB0"}
	err := portError("serial:///dev/ttyUSB0", a, &fs.PathError{Op: "open", Path: a.Device, Err: syscall.EACCES})
	if !strings.Contains(err.Error(), "permission denied") || !strings.Contains(err.Error(), "dialout") {
		t.Error(err)
	}
	if os.Geteuid() == 0 {
		return
	}
	dev := t.TempDir() + "/tty"
	if err := os.WriteFile(dev, nil, 0); err != nil {
		t.Fatal(err)
	}
	if _, err := lockPort(dev); err == nil {
		t.Error("a port without permission was opened")
	}
}

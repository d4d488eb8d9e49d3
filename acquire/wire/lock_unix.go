//go:build linux || darwin || freebsd || openbsd

package wire

import (
	"io"
	"os"
	"syscall"
)

// held is a file descriptor whose advisory lock goes when it is closed, or when the program dies.
type held int

func (h held) Close() error { return syscall.Close(int(h)) }

// lockPort takes an advisory lock on the device: an exclusive open does not bind root, a lock does.
func lockPort(device string) (io.Closer, error) {
	// O_NONBLOCK: a modem's port would otherwise wait for a carrier.
	fd, err := syscall.Open(device, syscall.O_RDWR|syscall.O_NOCTTY|syscall.O_NONBLOCK|syscall.O_CLOEXEC, 0)
	for err == syscall.EINTR {
		fd, err = syscall.Open(device, syscall.O_RDWR|syscall.O_NOCTTY|syscall.O_NONBLOCK|syscall.O_CLOEXEC, 0)
	}
	switch err {
	case nil:
	case syscall.EBUSY:
		return nil, errBusy
	case syscall.ENXIO, syscall.ENODEV:
		return nil, &os.PathError{Op: "open", Path: device, Err: syscall.ENOENT}
	default:
		return nil, &os.PathError{Op: "open", Path: device, Err: err}
	}
	var st syscall.Stat_t
	if err := syscall.Fstat(fd, &st); err == nil && st.Mode&syscall.S_IFMT != syscall.S_IFCHR {
		syscall.Close(fd)
		return nil, errNotDevice
	}
	if err := syscall.Flock(fd, syscall.LOCK_EX|syscall.LOCK_NB); err != nil || heldByOther(device, fd) {
		syscall.Close(fd)
		return nil, errBusy
	}
	return held(fd), nil
}

//go:build linux || darwin || freebsd || openbsd

package scpi

import "syscall"

// pending says whether bytes, or the link's end, wait to be read, without a wait of its own; known is false where the link
// is no socket.
func pending(link any) (some, known bool) {
	socket, ok := link.(syscall.Conn)
	if !ok {
		return false, false
	}
	raw, err := socket.SyscallConn()
	if err != nil {
		return false, false
	}
	var one [1]byte
	var peek error
	err = raw.Control(func(fd uintptr) {
		_, _, peek = syscall.Recvfrom(int(fd), one[:], syscall.MSG_PEEK|syscall.MSG_DONTWAIT)
	})
	return peek != syscall.EAGAIN, err == nil
}

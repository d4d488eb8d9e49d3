package wire

import (
	"path/filepath"
	"strings"
	"syscall"
	"unsafe"
)

// tiocgexcl asks whether a terminal is open exclusively (ioctl_tty(2)); the generic number, which
// x86, ARM and RISC-V share. Where it differs the call fails and nothing is known.
const tiocgexcl = 0x80045440

// heldByOther says whether a program that takes no advisory lock has the port open exclusively. Root
// would not be told otherwise. A pseudo-terminal is left out: it stays exclusive after its holder was
// killed, as long as its other end lives.
func heldByOther(device string, fd int) bool {
	if real, err := filepath.EvalSymlinks(device); err == nil && strings.HasPrefix(real, "/dev/pts/") {
		return false
	}
	return exclusive(fd)
}

func exclusive(fd int) bool {
	var on int32
	_, _, errno := syscall.Syscall(syscall.SYS_IOCTL, uintptr(fd), tiocgexcl, uintptr(unsafe.Pointer(&on)))
	return errno == 0 && on != 0
}

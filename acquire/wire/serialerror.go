package wire

import (
	"errors"
	"io/fs"

	"go.bug.st/serial"
)

var (
	errBusy      = errors.New("port is busy")           // another program has it
	errNotDevice = errors.New("not a character device") // a path leads to something else
)

// portError says in a sentence why a serial port did not open, and what cures it.
func portError(address string, a Address, err error) error {
	e := &OpenError{Address: address, Err: err, Problem: err.Error(), Cure: "check that " + a.Device + " is a serial port and takes these settings"}
	var p *serial.PortError
	code := serial.PortErrorCode(-1)
	if errors.As(err, &p) {
		code = p.Code()
	}
	switch {
	case errors.Is(err, errBusy) || code == serial.PortBusy:
		e.Problem = "the port is in use by another program"
		e.Cure = "end that program first (on Linux `fuser " + a.Device + "` names it)"
	case errors.Is(err, fs.ErrNotExist) || code == serial.PortNotFound:
		e.Problem = "there is no such device"
		e.Cure = "check that the adapter is plugged in, and its name (on Linux `ls /dev/serial/by-id`)"
	case errors.Is(err, fs.ErrPermission) || code == serial.PermissionDenied:
		e.Problem = "permission denied"
		e.Cure = "join the group that owns the port (on Linux `sudo usermod -aG dialout $USER`, then log in again)"
	case errors.Is(err, errNotDevice) || code == serial.InvalidSerialPort:
		e.Problem = "it is not a serial port"
		e.Cure = "name the device the instrument is plugged into, such as /dev/ttyUSB0"
	case code == serial.InvalidSpeed, code == serial.InvalidDataBits, code == serial.InvalidParity, code == serial.InvalidStopBits:
		e.Problem = "the port does not take these settings: " + p.EncodedErrorString()
		e.Cure = "use settings that both the instrument and the adapter know"
	}
	return e
}

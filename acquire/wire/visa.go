package wire

import (
	"fmt"
	"runtime"
	"strconv"
	"strings"

	"go.bug.st/serial"
)

// parseVISA reads TCPIP[board]::host::port::SOCKET and ASRLdevice::INSTR, in any letter case.
func parseVISA(s string) (Address, error) {
	fields, err := splitVISA(s)
	if err != nil {
		return Address{}, err
	}
	if kind := fields[0]; strings.EqualFold(kind[:min(4, len(kind))], "ASRL") {
		return visaSerial(kind[4:], fields[1:])
	}
	return visaSocket(fields[0][len("TCPIP"):], fields[1:])
}

// splitVISA cuts at the double colons that do not lie in the brackets of an IPv6 address.
func splitVISA(s string) ([]string, error) {
	open := strings.Index(s, "::[")
	if open < 0 {
		return strings.Split(s, "::"), nil
	}
	end := strings.IndexByte(s[open:], ']')
	if end < 0 {
		return nil, fmt.Errorf("the bracket round the IPv6 address is not closed")
	}
	end += open + 1
	fields := append(strings.Split(s[:open], "::"), s[open+2:end])
	rest, ok := strings.CutPrefix(s[end:], "::")
	if !ok {
		return nil, fmt.Errorf("a double colon must follow the bracket, as in TCPIP::[::1]::5025::SOCKET")
	}
	return append(fields, strings.Split(rest, "::")...), nil
}

func visaSocket(board string, fields []string) (Address, error) {
	if strings.Trim(board, "0123456789") != "" {
		return Address{}, fmt.Errorf("only a board number may follow TCPIP, not %q", board)
	}
	if len(fields) != 3 || !strings.EqualFold(fields[2], "SOCKET") {
		return Address{}, fmt.Errorf("of the TCPIP resources only sockets are spoken: write TCPIP::host::%d::SOCKET", DefaultPort)
	}
	host, err := parseHost(fields[0])
	if err != nil {
		return Address{}, err
	}
	port, err := parsePort(fields[1])
	if err != nil {
		return Address{}, err
	}
	return Address{Host: host, Port: port}, nil
}

func visaSerial(device string, fields []string) (Address, error) {
	if len(fields) > 1 || len(fields) == 1 && !strings.EqualFold(fields[0], "INSTR") {
		return Address{}, fmt.Errorf("a serial port ends in ::INSTR, as in ASRL/dev/ttyUSB0::INSTR")
	}
	if device == "" {
		return Address{}, fmt.Errorf("name the port after ASRL, as in ASRL/dev/ttyUSB0::INSTR")
	}
	a := Address{Device: device, Mode: serial.Mode{BaudRate: 9600, DataBits: 8}}
	if strings.Trim(device, "0123456789") == "" {
		n, err := strconv.Atoi(device)
		if err != nil || n < 1 || n > 256 {
			return Address{}, fmt.Errorf("ports are numbered from 1 to 256: name the device instead, as in ASRL/dev/ttyUSB0::INSTR")
		}
		a.Device = portNumber(runtime.GOOS, n)
	}
	if err := checkDevice(a.Device); err != nil {
		return Address{}, err
	}
	return a, nil
}

// portNumber gives the device of the nth serial port, n from 1.
func portNumber(goos string, n int) string {
	if goos == "windows" {
		return fmt.Sprintf("COM%d", n)
	}
	return fmt.Sprintf("/dev/ttyS%d", n-1)
}

package wire

import (
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"strconv"
	"strings"

	"go.bug.st/serial"
)

// DefaultPort is scpi-raw in IANA's Service Name and Transport Protocol Port Number Registry.
const DefaultPort = 5025

// Address says where an instrument is. Either Host or Device is set.
type Address struct {
	Host string // name or IP address, without brackets
	Port int    // 1 to 65535

	Device string      // path, or COM port, of a serial port
	Mode   serial.Mode // how the serial port is set
}

// Parse reads an address in one of the forms of the package comment. Errors quote it and say what is
// wrong with it; nothing is looked up or opened.
func Parse(address string) (Address, error) {
	a, err := parse(address)
	if err != nil {
		return Address{}, fmt.Errorf("address %q: %w", clip(address), err)
	}
	return a, nil
}

func parse(s string) (Address, error) {
	for i := range len(s) {
		if s[i] <= ' ' || s[i] > 0x7e {
			return Address{}, fmt.Errorf("it must be plain ASCII without blanks")
		}
	}
	lower := strings.ToLower(s)
	switch {
	case strings.HasPrefix(lower, "tcp://"):
		return parseTCP(s[len("tcp://"):])
	case strings.HasPrefix(lower, "serial://"):
		return parseSerial(s[len("serial://"):])
	case strings.HasPrefix(lower, "tcpip"), strings.HasPrefix(lower, "asrl"):
		return parseVISA(s)
	case strings.HasPrefix(lower, "usb"), strings.HasPrefix(lower, "gpib"), strings.HasPrefix(lower, "vxi"), strings.HasPrefix(lower, "pxi"):
		return Address{}, fmt.Errorf("only TCP sockets and serial ports are spoken: use the instrument's LAN socket or serial port")
	}
	return Address{}, fmt.Errorf("it must begin with tcp://, serial://, TCPIP or ASRL, as in tcp://host:5025 or serial:///dev/ttyUSB0?baud=9600")
}

func parseTCP(s string) (Address, error) {
	if i := strings.IndexAny(s, "/?#@"); i >= 0 {
		return Address{}, fmt.Errorf("only a host and a port may follow tcp://, not %q", s[i:])
	}
	host, port := s, ""
	switch i := strings.LastIndexByte(s, ':'); {
	case strings.HasPrefix(s, "["):
		end := strings.IndexByte(s, ']')
		if end < 0 {
			return Address{}, fmt.Errorf("the bracket round the IPv6 address is not closed")
		}
		host, port = s[:end+1], s[end+1:]
		if port != "" && port[0] != ':' {
			return Address{}, fmt.Errorf("a colon and a port must follow the bracket, not %q", port)
		}
	case strings.Count(s, ":") > 1:
		return Address{}, fmt.Errorf("write an IPv6 address in brackets, as in tcp://[::1]:5025")
	case i >= 0:
		host, port = s[:i], s[i:]
	}
	a := Address{Port: DefaultPort}
	var err error
	if a.Host, err = parseHost(host); err != nil {
		return Address{}, err
	}
	if port != "" {
		if a.Port, err = parsePort(port[1:]); err != nil {
			return Address{}, err
		}
	}
	return a, nil
}

// parseHost takes the brackets off an IPv6 address and refuses what no host is called.
func parseHost(host string) (string, error) {
	if inner, ok := strings.CutPrefix(host, "["); ok {
		inner, ok = strings.CutSuffix(inner, "]")
		ip, err := netip.ParseAddr(inner)
		if !ok || err != nil || !ip.Is6() {
			return "", fmt.Errorf("%q is not an IPv6 address", host)
		}
		return inner, nil
	}
	if host == "" {
		return "", fmt.Errorf("the host is missing")
	}
	for _, c := range host {
		if !(c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || c == '.' || c == '-' || c == '_') {
			return "", fmt.Errorf("%q is not the name of a host", host)
		}
	}
	return host, nil
}

func parsePort(s string) (int, error) {
	p, err := strconv.ParseUint(s, 10, 16)
	if err != nil || p == 0 {
		return 0, fmt.Errorf("port %q: it must be a number from 1 to 65535", s)
	}
	return int(p), nil
}

// String gives the address in its tcp:// or serial:// form.
func (a Address) String() string {
	if a.Device != "" {
		return "serial://" + (&url.URL{Path: a.Device}).EscapedPath() + "?" + modeQuery(a.Mode)
	}
	return "tcp://" + net.JoinHostPort(a.Host, strconv.Itoa(a.Port))
}

func clip(s string) string {
	if len(s) > 80 {
		return s[:80] + "..."
	}
	return s
}

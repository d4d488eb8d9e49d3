package wire

import (
	"strings"
	"testing"

	"go.bug.st/serial"
)

func TestParse(t *testing.T) {
	for in, want := range map[string]string{
		"tcp://scope.lab:5025":               "tcp://scope.lab:5025",
		"tcp://192.0.2.10":                   "tcp://192.0.2.10:5025",
		"TCP://scope:1":                      "tcp://scope:1",
		"tcp://[2001:db8::7]":                "tcp://[2001:db8::7]:5025",
		"tcp://[::1]:65535":                  "tcp://[::1]:65535",
		"tcp://[fe80::1%eth0]:5025":          "tcp://[fe80::1%eth0]:5025",
		"TCPIP::scope.lab::5025::SOCKET":     "tcp://scope.lab:5025",
		"TCPIP0::192.0.2.10::4000::SOCKET":   "tcp://192.0.2.10:4000",
		"tcpip2::scope::5025::socket":        "tcp://scope:5025",
		"TCPIP::[2001:db8::7]::5025::SOCKET": "tcp://[2001:db8::7]:5025",
		"serial:///dev/ttyUSB0":              "serial:///dev/ttyUSB0?baud=9600&data=8&parity=none&stop=1",
		"serial:///dev/ttyUSB0?baud=115200&flow=none&parity=EVEN&data=7&stop=2": "serial:///dev/ttyUSB0?baud=115200&data=7&parity=even&stop=2",
		"serial://COM3?stop=1.5": "serial://COM3?baud=9600&data=8&parity=none&stop=1.5",
		"serial:///dev/serial/by-path/pci-0000:00:14.0-usb-0:2:1.0-port0": "serial:///dev/serial/by-path/pci-0000:00:14.0-usb-0:2:1.0-port0?baud=9600&data=8&parity=none&stop=1",
		"serial:///dev/a%20b":     "serial:///dev/a%20b?baud=9600&data=8&parity=none&stop=1",
		"ASRL/dev/ttyACM0::INSTR": "serial:///dev/ttyACM0?baud=9600&data=8&parity=none&stop=1",
		"asrl/dev/ttyACM0::instr": "serial:///dev/ttyACM0?baud=9600&data=8&parity=none&stop=1",
		"ASRL/dev/ttyACM0":        "serial:///dev/ttyACM0?baud=9600&data=8&parity=none&stop=1",
		"ASRLCOM7::INSTR":         "serial://COM7?baud=9600&data=8&parity=none&stop=1",
	} {
		a, err := Parse(in)
		if err != nil {
			t.Errorf("Parse(%q): %v", in, err)
			continue
		}
		if got := a.String(); got != want {
			t.Errorf("Parse(%q) = %s; want %s", in, got, want)
		}
		if again, err := Parse(a.String()); err != nil || again != a {
			t.Errorf("%s does not come back: %+v, %v", a, again, err)
		}
	}
	a, err := Parse("serial:///dev/x?parity=odd&stop=2&data=7&baud=300")
	if err != nil || a.Mode != (serial.Mode{BaudRate: 300, DataBits: 7, Parity: serial.OddParity, StopBits: serial.TwoStopBits}) {
		t.Errorf("%+v, %v", a.Mode, err)
	}
}

func TestPortNumber(t *testing.T) {
	if got := portNumber("windows", 3); got != "COM3" {
		t.Error(got)
	}
	if got := portNumber("linux", 3); got != "/dev/ttyS2" {
		t.Error(got)
	}
}

func TestParseRefuses(t *testing.T) {
	for in, want := range map[string]string{
		"":                                "must begin with tcp://",
		"scope.lab:5025":                  "must begin with tcp://",
		"http://scope.lab":                "must begin with tcp://",
		"tcp://":                          "host is missing",
		"tcp://:5025":                     "host is missing",
		"tcp://scope:":                    `port ""`,
		"tcp://scope:0":                   `port "0"`,
		"tcp://scope:65536":               `port "65536"`,
		"tcp://scope:+80":                 `port "+80"`,
		"tcp://scope:scpi":                `port "scpi"`,
		"tcp://scope/x":                   `not "/x"`,
		"tcp://me@scope":                  `not "@scope"`,
		"tcp://a b":                       "without blanks",
		"tcp://a\nb":                      "without blanks",
		"tcp://sc\u00f6pe":                "plain ASCII",
		"tcp://::1:5025":                  "in brackets",
		"tcp://[::1":                      "not closed",
		"tcp://[::1]5025":                 "must follow the bracket",
		"tcp://[scope]:5025":              "not an IPv6 address",
		"tcp://[192.0.2.1]:5025":          "not an IPv6 address",
		"tcp://a,b":                       "not the name of a host",
		"serial://":                       "name the device",
		"serial://ttyUSB0":                "name the device",
		"serial:///dev/x?baud=fast":       "baud=fast",
		"serial:///dev/x?baud=-9600":      "baud=-9600",
		"serial:///dev/x?data=5":          "data=5",
		"serial:///dev/x?parity=both":     "parity=both",
		"serial:///dev/x?stop=3":          "stop=3",
		"serial:///dev/x?flow=rtscts":     "flow control is not done",
		"serial:///dev/x?speed=9600":      `unknown setting "speed"`,
		"serial:///dev/x?baud=1&baud=2":   "given twice",
		"serial:///dev/x?baud=%zz":        "settings",
		"serial:///dev/%zz":               "device",
		"serial:///dev/x%0a":              "name the device",
		"TCPIP::scope":                    "TCPIP::host::5025::SOCKET",
		"TCPIP::scope::INSTR":             "only sockets are spoken",
		"TCPIP::scope::inst0::INSTR":      "only sockets are spoken",
		"TCPIP::scope::hislip0::INSTR":    "only sockets are spoken",
		"TCPIP::scope::5025::SOCKET::x":   "only sockets are spoken",
		"TCPIP::scope::99999::SOCKET":     `port "99999"`,
		"TCPIP::::5025::SOCKET":           "host is missing",
		"TCPIPx::scope::5025::SOCKET":     `not "x"`,
		"TCPIP::[::1::5025::SOCKET":       "not closed",
		"TCPIP::[::1]5025::SOCKET":        "double colon must follow",
		"ASRL::INSTR":                     "name the port after ASRL",
		"ASRL0::INSTR":                    "numbered from 1",
		"ASRL99999999999999999999::INSTR": "numbered from 1",
		"ASRLttyUSB0::INSTR":              "name the device",
		"ASRL/dev/x::SOCKET":              "ends in ::INSTR",
		"USB0::0x1234::0x5678::A1::INSTR": "only TCP sockets and serial ports",
		"GPIB0::7::INSTR":                 "only TCP sockets and serial ports",
	} {
		a, err := Parse(in)
		if err == nil {
			t.Errorf("Parse(%q) = %s; want a refusal", in, a)
			continue
		}
		if !strings.Contains(err.Error(), want) || !strings.HasPrefix(err.Error(), "address \"") {
			t.Errorf("Parse(%q): %v; want it to say %s", in, err, want)
		}
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"tcp://scope:5025", "tcp://[::1]", "serial:///dev/ttyUSB0?baud=9600&parity=odd", "TCPIP0::[::1]::5025::SOCKET", "ASRL1::INSTR", "ASRL/dev/x::INSTR", "serial:///dev/%25", "serial://COM1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		a, err := Parse(s)
		if err != nil {
			return
		}
		again, err := Parse(a.String())
		if err != nil || again != a {
			t.Fatalf("%q is %+v, whose string %s is %+v, %v", s, a, a, again, err)
		}
	})
}

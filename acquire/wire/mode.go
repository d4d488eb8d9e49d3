package wire

import (
	"fmt"
	"net/url"
	"slices"
	"strconv"
	"strings"

	"go.bug.st/serial"
)

// The names of the settings, and the values of each.
var (
	parities = []string{serial.NoParity: "none", serial.OddParity: "odd", serial.EvenParity: "even", serial.MarkParity: "mark", serial.SpaceParity: "space"}
	stops    = []string{serial.OneStopBit: "1", serial.OnePointFiveStopBits: "1.5", serial.TwoStopBits: "2"}
)

// parseSerial reads device?baud=9600&data=8&parity=none&stop=1&flow=none.
func parseSerial(s string) (Address, error) {
	device, query, _ := strings.Cut(s, "?")
	device, err := url.PathUnescape(device)
	if err != nil {
		return Address{}, fmt.Errorf("device: %w", err)
	}
	if err := checkDevice(device); err != nil {
		return Address{}, err
	}
	a := Address{Device: device, Mode: serial.Mode{BaudRate: 9600, DataBits: 8}}
	settings, err := url.ParseQuery(query)
	if err != nil {
		return Address{}, fmt.Errorf("settings: %w", err)
	}
	names := make([]string, 0, len(settings))
	for name := range settings {
		names = append(names, name)
	}
	slices.Sort(names) // or the error of two would change from run to run
	for _, name := range names {
		if len(settings[name]) > 1 {
			return Address{}, fmt.Errorf("setting %s is given twice", name)
		}
		if err := set(&a.Mode, name, settings[name][0]); err != nil {
			return Address{}, err
		}
	}
	return a, nil
}

func set(m *serial.Mode, name, value string) error {
	var err error
	switch name {
	case "baud":
		m.BaudRate, err = strconv.Atoi(value)
		if err != nil || m.BaudRate < 50 || m.BaudRate > 12_000_000 {
			return fmt.Errorf("baud=%s: it must be a rate such as 9600 or 115200", value)
		}
	case "data":
		m.DataBits, err = strconv.Atoi(value)
		if err != nil || m.DataBits < 7 || m.DataBits > 8 {
			return fmt.Errorf("data=%s: it must be 7 or 8 (ASCII needs seven bits)", value)
		}
	case "parity":
		i := slices.Index(parities, strings.ToLower(value))
		if i < 0 {
			return fmt.Errorf("parity=%s: it must be one of %s", value, strings.Join(parities, ", "))
		}
		m.Parity = serial.Parity(i)
	case "stop":
		i := slices.Index(stops, value)
		if i < 0 {
			return fmt.Errorf("stop=%s: it must be one of %s", value, strings.Join(stops, ", "))
		}
		m.StopBits = serial.StopBits(i)
	case "flow":
		if value != "none" {
			return fmt.Errorf("flow=%s: flow control is not done here; switch it off on the instrument and write flow=none", value)
		}
	default:
		return fmt.Errorf("unknown setting %q: there are baud, data, parity, stop and flow", name)
	}
	return nil
}

func modeQuery(m serial.Mode) string {
	return fmt.Sprintf("baud=%d&data=%d&parity=%s&stop=%s", m.BaudRate, m.DataBits, parities[m.Parity], stops[m.StopBits])
}

// checkDevice wants a path or a COM port, and not the bare name of something in the working folder.
func checkDevice(device string) error {
	upper := strings.ToUpper(device)
	if n, ok := strings.CutPrefix(upper, "COM"); ok && n != "" && strings.Trim(n, "0123456789") == "" {
		return nil
	}
	if len(device) > 1 && device[0] == '/' && !strings.ContainsAny(device, "\x00\r\n") {
		return nil
	}
	return fmt.Errorf("serial port %q: name the device by its path or as COM port, as in serial:///dev/ttyUSB0 or serial://COM3", device)
}

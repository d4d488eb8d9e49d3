package device

import "strconv"

// common lists the commands every instrument has: the thirteen that IEEE 488.2, 4.7 makes mandatory,
// and SCPI's error queue and version. Every command here ends before its reply leaves, so *OPC, *OPC?
// and *WAI have nothing to wait for.
func (in *Instrument) common() []Command {
	s := &in.status
	return []Command{
		ask("*IDN?", func() string { return in.identity }),
		tell("*CLS", s.clear),
		tell("*RST", func() {
			if in.reset != nil {
				in.reset()
			}
		}),
		tell("*OPC", func() { s.event |= 1 }),
		ask("*OPC?", func() string { return "1" }),
		tell("*WAI", func() {}),
		ask("*TST?", func() string { return "0" }),
		ask("*ESR?", func() string {
			v := s.event
			s.event = 0
			return strconv.Itoa(int(v))
		}),
		ask("*STB?", func() string { return strconv.Itoa(int(s.byte(in.waiting))) }),
		register("*ESE", &s.eventEnable, 0xFF),
		ask("*ESE?", func() string { return strconv.Itoa(int(s.eventEnable)) }),
		register("*SRE", &s.requestMask, 0xFF&^64), // bit 6 is not for masking: 488.2, 11.3.2.3
		ask("*SRE?", func() string { return strconv.Itoa(int(s.requestMask)) }),
		ask("SYSTem:ERRor[:NEXT]?", func() string { return s.next().Error() }),
		ask("SYSTem:VERSion?", func() string { return "1999.0" }),
	}
}

// ask makes a query without arguments.
func ask(header string, answer func() string) Command {
	return Command{Header: header, Do: func([]Arg) (string, error) { return answer(), nil }}
}

// tell makes a command without arguments.
func tell(header string, do func()) Command {
	return Command{Header: header, Do: func([]Arg) (string, error) { do(); return "", nil }}
}

// register makes a command that sets an eight-bit mask.
func register(header string, mask *uint8, settable uint8) Command {
	return Command{Header: header, Min: 1, Max: 1, Do: func(args []Arg) (string, error) {
		v, err := args[0].Number()
		if err != nil {
			return "", err
		}
		if !(v > -0.5 && v < 255.5) {
			return "", Errorf(-222, "a mask lies in 0 to 255")
		}
		*mask = uint8(v+0.5) & settable
		return "", nil
	}}
}

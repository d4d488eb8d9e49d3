package quantity

// Unit is the unit a quantity is read and written in. It is named for the quantity, because one unit
// serves each quantity here.
type Unit uint8

// The units. Ratio is the unit of a plain number.
const (
	Ratio       Unit = iota
	Capacitance      // farad
	Inductance       // henry
	Resistance       // ohm
	Voltage          // volt
	Current          // ampere
	Frequency        // hertz
	Time             // second
	Power            // watt
	Energy           // joule
	Temperature      // degree Celsius
)

// unitFacts is what the package knows of one unit.
type unitFacts struct {
	quantity string   // with its article
	name     string   // the unit in words
	symbol   string   // as printed
	spelled  []string // as read, after a number or after a prefix
	mark     string   // letter that marks the decimal point in a code; "": none
	example  string
	signed   bool // may be negative
	prefixed bool // takes SI prefixes
}

var units = [...]unitFacts{
	Ratio:       {"a plain number", "", "", nil, "", "0.35", true, false},
	Capacitance: {"a capacitance", "farad", "F", []string{"F"}, "F", "470p or 470 pF", false, true},
	Inductance:  {"an inductance", "henry", "H", []string{"H"}, "H", "12n or 12 nH", false, true},
	// U+03A9 is printed; U+2126 is what some keyboards and documents give.
	Resistance:  {"a resistance", "ohm", "\u03a9", []string{"ohm", "ohms", "Ohm", "\u03a9", "\u2126"}, "R", "4k7 or 4.7 kohm", false, true},
	Voltage:     {"a voltage", "volt", "V", []string{"V"}, "V", "48V or 48 V", true, true},
	Current:     {"a current", "ampere", "A", []string{"A"}, "A", "2.5A or 2.5 A", true, true},
	Frequency:   {"a frequency", "hertz", "Hz", []string{"Hz"}, "", "1.8M or 1.8 MHz", false, true},
	Time:        {"a time", "second", "s", []string{"s"}, "", "120n or 120 ns", true, true},
	Power:       {"a power", "watt", "W", []string{"W"}, "W", "250m or 250 mW", true, true},
	Energy:      {"an energy", "joule", "J", []string{"J"}, "", "2.2u or 2.2 uJ", true, true},
	Temperature: {"a temperature", "degree Celsius", "\u00b0C", []string{"degC", "\u00b0C", "\u2103"}, "", "25 or 25 degC", true, false},
}

// facts answers for a Unit that does not exist as for a plain number, so that nothing here can panic.
func (u Unit) facts() *unitFacts {
	if int(u) >= len(units) {
		u = Ratio
	}
	return &units[u]
}

// Symbol is the unit's symbol as printed: "F", "H", "\u03a9"; "" for Ratio.
func (u Unit) Symbol() string { return u.facts().symbol }

// Name is the unit in words: "farad"; "" for Ratio.
func (u Unit) Name() string { return u.facts().name }

// Quantity is what the unit measures, in words with the article: "a capacitance".
func (u Unit) Quantity() string { return u.facts().quantity }

// Example is what somebody might type for a quantity in this unit: "470p or 470 pF".
func (u Unit) Example() string { return u.facts().example }

// Signed says whether a quantity in this unit may be negative. Capacitance, inductance, resistance and
// frequency may not.
func (u Unit) Signed() bool { return u.facts().signed }

// expected says what should have been written, for an error.
func (u Unit) expected() string {
	if u.Name() == "" {
		return u.Quantity() + " was expected"
	}
	return u.Quantity() + " was expected, in " + u.Name()
}

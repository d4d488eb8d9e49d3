package quantity

// String writes the quantity with its prefix and unit, exactly.
func (q Farad) String() string { return saneFarad.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Farad) Set(s string) error {
	v, err := saneFarad.read(s)
	if err == nil {
		*q = Farad(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Farad) Type() string { return "F" }

// String writes the quantity with its prefix and unit, exactly.
func (q Henry) String() string { return saneHenry.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Henry) Set(s string) error {
	v, err := saneHenry.read(s)
	if err == nil {
		*q = Henry(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Henry) Type() string { return "H" }

// String writes the quantity with its prefix and unit, exactly.
func (q Ohm) String() string { return saneOhm.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Ohm) Set(s string) error {
	v, err := saneOhm.read(s)
	if err == nil {
		*q = Ohm(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Ohm) Type() string { return "ohm" }

// String writes the quantity with its prefix and unit, exactly.
func (q Volt) String() string { return saneVolt.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Volt) Set(s string) error {
	v, err := saneVolt.read(s)
	if err == nil {
		*q = Volt(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Volt) Type() string { return "V" }

// String writes the quantity with its prefix and unit, exactly.
func (q Ampere) String() string { return saneAmpere.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Ampere) Set(s string) error {
	v, err := saneAmpere.read(s)
	if err == nil {
		*q = Ampere(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Ampere) Type() string { return "A" }

// String writes the quantity with its prefix and unit, exactly.
func (q Hertz) String() string { return saneHertz.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Hertz) Set(s string) error {
	v, err := saneHertz.read(s)
	if err == nil {
		*q = Hertz(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Hertz) Type() string { return "Hz" }

// String writes the quantity with its prefix and unit, exactly.
func (q Second) String() string { return saneSecond.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Second) Set(s string) error {
	v, err := saneSecond.read(s)
	if err == nil {
		*q = Second(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Second) Type() string { return "s" }

// String writes the quantity with its prefix and unit, exactly.
func (q Watt) String() string { return saneWatt.show(float64(q)) }

// Set reads s; it leaves the value as it was when s is refused.
func (q *Watt) Set(s string) error {
	v, err := saneWatt.read(s)
	if err == nil {
		*q = Watt(v)
	}
	return err
}

// Type is the unit that help texts show.
func (Watt) Type() string { return "W" }

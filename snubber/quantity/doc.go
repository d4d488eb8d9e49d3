// Package quantity reads and writes quantities as people in the trade write them: with an SI prefix
// (470 pF), as a letter code (2n2, 4k7, 10R, R47), as a percentage (5%), or as a value with its
// standard uncertainty in parentheses (12.34(56) nH).
//
// It stands at the edge of the program. Inside, everything is a float64 in SI base units; here is where
// prefixes come off and go on. It does no arithmetic with units, converts between none (no inch, no
// degree Fahrenheit), and knows only the units this program meets.
//
// # Reading: grammar first, then sense
//
// Reading has two degrees of strictness, and both refuse by an error that quotes the input and says what
// to write instead:
//
//   - Grammar: [Parse], [ParseFraction] and [ParseUncertain] accept whatever is well formed, finite and in
//     the unit asked for. Parse also refuses a minus sign where the quantity has none (see [Unit.Signed]);
//     ParseUncertain does not, because an estimate may fall below zero.
//   - Sense: the flag values ([Farad], [Henry], [Ohm], [Volt], [Ampere], [Hertz], [Second], [Watt] and
//     [Fraction]) read by the same grammar and then insist on what a part, a bus or a ring in this trade can
//     be. "470" is a well-formed capacitance, and Farad refuses it: 470 F is a forgotten prefix.
//
// # Standards
//
// Prefixes, unit symbols and the space between number and unit follow the SI Brochure (BIPM, The
// International System of Units, 9th edition, 2019, chapters 3 and 5). Letter codes follow IEC 60062,
// Marking codes for resistors and capacitors; its rules are given here from memory. Deviations: R is a
// decimal mark for ohms only, since on other parts it stands for different units in different hands; codes
// are read for every unit, not for resistors and capacitors alone; both K, the standard's letter for
// resistors, and k are kilo in a code; V, H, A and W may mark the decimal point (3V3), which is common
// practice. Value and uncertainty follow JCGM 100:2008, Evaluation of measurement data: Guide to the
// expression of uncertainty in measurement (GUM), 7.2.2.
//
// Numbers are assembled as decimal text and converted once, so that 2n2 is exactly the float64 nearest
// to 2.2e-9, as a Go literal is.
package quantity

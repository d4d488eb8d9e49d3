// Package preferred is the E series of IEC 60063, Preferred number series for resistors and capacitors: the
// values parts are made in.
//
// It knows whole series, each repeating in every decade, and finds the value nearest to, next above or next below
// a wanted one, or all between two. It does not know what is in stock, and a series does not say that a part of a
// given kind is made over all its decades.
//
// Every value it gives is the float64 nearest to the decimal number: 2.2e-9 from here equals the literal 2.2e-9.
package preferred

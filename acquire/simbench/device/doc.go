// Package device is the instrument's side of a SCPI dialogue: it parses program messages, keeps the
// status registers and the error queue, calls the command that a header names, and answers over any
// byte stream.
//
// It follows IEEE 488.2-1992 for message syntax, common commands and status reporting, and SCPI-1999
// for headers (short and long form, optional nodes, the current path inside a compound message) and
// the error queue. It deviates where a byte stream does: a message ends at a line feed, so a block
// argument may not hold one; and because the stream itself is the output queue, a reply can be neither
// interrupted (-410) nor unterminated (-420): replies leave in the order the queries came.
//
// It is no client (that is acquire/scpi, which shares no code with it) and knows nothing of boards.
package device

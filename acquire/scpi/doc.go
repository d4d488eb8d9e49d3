// Package scpi speaks to an instrument in IEEE 488.2 program messages with SCPI-1999 headers over any
// io.ReadWriteCloser: a socket, a serial port, one end of a pipe in a test.
//
// It sends commands and queries, reads the replies the standard defines (numbers in NR1, NR2 and NR3
// form, strings, definite and indefinite blocks, lines), and empties the instrument's error queue after
// every one of them. It is not a driver: it knows no instrument's commands beyond *IDN? and
// SYSTem:ERRor?, opens no links (see package wire) and keeps no state of the instrument's settings.
//
// Where it deviates from the standards: a reply ends at a line feed or a carriage return, whichever
// comes first, since a byte stream carries no END message; an indefinite block ends at the first line
// feed for the same reason; a mnemonic may be longer than the 12 characters of IEEE 488.2, 7.6.1.4.1.
//
// # Errors
//
// Three things can go wrong, and each has its type. The instrument refused: [*InstrumentError], with
// the number and the text it gave. The instrument spoke nonsense: [*ReplyError], which quotes it. The
// link failed or stayed silent: [*LinkError]. A number that means "no reading" (9.91E37 or +-9.9E37)
// is [ErrNoReading] and never a number.
//
// # Staying in step
//
// A reply that comes late must never be taken for the reply to the next query. Four rules see to it:
//
//   - After a failed, silent or nonsensical exchange the Conn refuses every further one with
//     [ErrOutOfStep], until [Conn.Resync] has thrown away what was under way and heard the instrument's
//     identity again, or until the link is opened anew.
//   - A reply followed at once by more text is not taken. Behind a block may stand a line end, or two; anything else,
//     blanks and NULs included, at once or before the queue's reply, shows that its count was too small. (A surplus of
//     line feeds alone cannot be told from a doubled terminator: who knows how many bytes to expect has to look.)
//   - The error queue is read after each reply and before it is handed over. Instruments answer in
//     order: were the reply one from before, the true one would now come in place of the queue's
//     `number,"text"`, and both are refused. (So Options.NoErrorQueue gives up more than error texts.)
//   - An instrument without an error queue is not asked while something lies there that nobody asked for. What comes
//     between question and reply it can still pass off as the reply: that is the price of Options.NoErrorQueue.
//
// # Manners
//
// A reply may begin with the header of its query, in short form or long (IEEE 488.2, 8.3), or with blanks; it may end
// with LF, CR LF or CR. What no reply can be told from is dropped only where Options says that it comes: a prompt, or the
// message repeated. Where a link is not a socket, listening to one without an error queue takes about a millisecond.
//
// # Waiting
//
// A line must be whole within Options.Timeout. A block, or a line that is streamed, may take as long as it likes while
// bytes keep coming: there the timeout bounds each silence. The context bounds both.
//
// Sources: IEEE Std 488.2-1992, Standard Codes, Formats, Protocols, and Common Commands; SCPI-1999,
// Volume 1, Syntax and Style, and Volume 2, Command Reference, chapter 21 (SYSTem:ERRor). What they say
// was checked through secondary copies only; the clause numbers given in this package are from memory.
package scpi

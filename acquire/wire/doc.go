// Package wire opens the byte stream to an instrument: a TCP socket or a serial port, named by an
// address.
//
//	tcp://scope.lab:5025            a socket; the port is 5025 (scpi-raw in IANA's registry) when left out
//	tcp://[2001:db8::7]:5025        an IPv6 address in brackets
//	serial:///dev/ttyUSB0           a serial port, 9600 baud 8N1 when nothing else is said
//	serial:///dev/ttyUSB0?baud=115200&data=8&parity=even&stop=1&flow=none
//	serial://COM3?baud=19200        the same on Windows
//	TCPIP0::scope.lab::5025::SOCKET the VISA resource string of a socket
//	ASRL/dev/ttyUSB0::INSTR         the VISA resource string of a serial port, by device (9600 baud 8N1)
//	ASRL3::INSTR                    or by number: COM3 on Windows, /dev/ttyS2 elsewhere
//
// The resource strings follow the grammar of the IVI Foundation's VPP-4.3, The VISA Library, section
// 4.3.1 (through secondary copies; the section's number from memory); letter case does not matter and a board number after TCPIP is read past.
// What a number after ASRL stands for is the platform's business; counting from 1 is common practice.
//
// It is not a VISA library: VXI-11, HiSLIP, USBTMC and GPIB are not spoken, and flow control on a serial
// port is not done.
//
// A serial port is locked while it is open, so that two programs cannot share one by mistake. A lock
// is needed because an exclusive open binds everyone but root.
package wire

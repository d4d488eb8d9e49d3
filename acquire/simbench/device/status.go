package device

// status is what IEEE 488.2, chapter 11, and SCPI's error queue keep of what went on.
type status struct {
	event        uint8 // standard event status register
	eventEnable  uint8
	requestMask  uint8 // service request enable
	queue        []*Error
	queueHolding int // how many entries the queue holds, >= 2
}

// queueLength is how many errors an instrument keeps; the standard asks for two at least.
const queueLength = 16

// powerOn is the state of a device just switched on: PON is set.
func powerOn() status { return status{event: 128, queueHolding: queueLength} }

// raise notes an error. In a full queue the last place tells of the overflow and the older entries
// stay (SCPI-1999 volume 2, 21.8.1).
func (s *status) raise(e *Error) {
	s.event |= e.eventBit()
	if len(s.queue) < s.queueHolding {
		s.queue = append(s.queue, e)
		return
	}
	overflow := &Error{Code: -350}
	s.event |= overflow.eventBit()
	s.queue[len(s.queue)-1] = overflow
}

// next takes the oldest error off the queue.
func (s *status) next() *Error {
	if len(s.queue) == 0 {
		return &Error{}
	}
	e := s.queue[0]
	s.queue = s.queue[1:]
	return e
}

// clear is *CLS: the masks stay.
func (s *status) clear() { s.event, s.queue = 0, nil }

// byte is the status byte as *STB? reads it; waiting says that a reply stands in the output queue.
func (s *status) byte(waiting bool) uint8 {
	var b uint8
	if len(s.queue) > 0 {
		b |= 4
	}
	if waiting {
		b |= 16 // MAV
	}
	if s.event&s.eventEnable != 0 {
		b |= 32 // ESB
	}
	if b&s.requestMask != 0 {
		b |= 64 // MSS
	}
	return b
}

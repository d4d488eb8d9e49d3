package scpi

// queueOverflow replaces the last entry of an error queue that had no room for more.
const queueOverflow = -350

// Class is the kind of an entry in the error queue, told by its number alone.
type Class string

// The classes of SCPI-1999, Volume 2, 21.8.
const (
	NoError           Class = "no error"
	CommandError      Class = "command error"
	ExecutionError    Class = "execution error"
	DeviceError       Class = "device error"
	QueryError        Class = "query error"
	PowerOn           Class = "power on"
	UserRequest       Class = "user request"
	RequestControl    Class = "request control"
	OperationComplete Class = "operation complete"
	Reserved          Class = "reserved" // a negative number the standard gives no class
)

// ClassOf gives the class of an error number. Every positive number is the device's own.
func ClassOf(number int) Class {
	if number > 0 {
		return DeviceError
	}
	if number == 0 {
		return NoError
	}
	switch -number / 100 {
	case 1:
		return CommandError
	case 2:
		return ExecutionError
	case 3:
		return DeviceError
	case 4:
		return QueryError
	case 5:
		return PowerOn
	case 6:
		return UserRequest
	case 7:
		return RequestControl
	case 8:
		return OperationComplete
	}
	return Reserved
}

// ESR is the weight of the bit that an entry of this class sets in the standard event status register
// (IEEE 488.2, 11.5.1); 0 for none.
func (c Class) ESR() int {
	switch c {
	case OperationComplete:
		return 1
	case RequestControl:
		return 2
	case QueryError:
		return 4
	case DeviceError:
		return 8
	case ExecutionError:
		return 16
	case CommandError:
		return 32
	case UserRequest:
		return 64
	case PowerOn:
		return 128
	}
	return 0
}

package link

import (
	"encoding/binary"
	"fmt"
)

// Function is one of the four read functions.
type Function byte

// The read functions of APP V1.1b3, 6.1 to 6.4.
const (
	ReadCoils            Function = 1
	ReadDiscreteInputs   Function = 2
	ReadHoldingRegisters Function = 3
	ReadInputRegisters   Function = 4
)

func (f Function) String() string {
	switch f {
	case ReadCoils:
		return "coil"
	case ReadDiscreteInputs:
		return "discrete"
	case ReadHoldingRegisters:
		return "holding"
	case ReadInputRegisters:
		return "input"
	}
	return fmt.Sprintf("function %d", byte(f))
}

// readsBits tells the functions that read single bits.
func (f Function) readsBits() bool { return f == ReadCoils || f == ReadDiscreteInputs }

// maxQuantity is the most a request may ask for (APP V1.1b3, 6.1 and 6.3); 0 for a function that is not a read.
func (f Function) maxQuantity() int {
	switch f {
	case ReadCoils, ReadDiscreteInputs:
		return 2000
	case ReadHoldingRegisters, ReadInputRegisters:
		return 125
	}
	return 0
}

// Sizes of frames (TCP guide V1.0b, 3.1.3; APP V1.1b3, 4.1).
const (
	headerSize    = 7
	maxFrame      = 260
	requestFrame  = 12
	exceptionBody = 3 // value of the length field of an exception: unit, function, code
	maxBody       = maxFrame - headerSize + 1
)

// allowed is the allow-list: it gives nil for a well-formed read and nothing else.
func allowed(adu []byte) error {
	if len(adu) != requestFrame {
		return &RequestError{fmt.Sprintf("frame of %d bytes; a read has %d", len(adu), requestFrame)}
	}
	f := Function(adu[7])
	most := f.maxQuantity()
	if most == 0 {
		return &RequestError{fmt.Sprintf("function code %d; only 1 to 4 leave this program", adu[7])}
	}
	if p, n := binary.BigEndian.Uint16(adu[2:]), binary.BigEndian.Uint16(adu[4:]); p != 0 || n != 6 {
		return &RequestError{fmt.Sprintf("protocol %d, length %d; a read has 0 and 6", p, n)}
	}
	address, quantity := int(binary.BigEndian.Uint16(adu[8:])), int(binary.BigEndian.Uint16(adu[10:]))
	return allowedBlock(f, address, quantity)
}

// allowedBlock checks a block's limits in int arithmetic, where address plus quantity cannot wrap around.
func allowedBlock(f Function, address, quantity int) error {
	most := f.maxQuantity()
	switch {
	case most == 0:
		return &RequestError{fmt.Sprintf("function code %d; only 1 to 4 leave this program", byte(f))}
	case quantity < 1 || quantity > most:
		return &RequestError{fmt.Sprintf("quantity %d; %s takes 1 to %d", quantity, f, most)}
	case address < 0 || address+quantity > 65536:
		return &RequestError{fmt.Sprintf("%s %d and %d on; addresses end at 65535", f, address, quantity)}
	}
	return nil
}

// dataBytes is how many bytes of data answer a request.
func dataBytes(f Function, quantity int) int {
	if f.readsBits() {
		return (quantity + 7) / 8
	}
	return 2 * quantity
}

// wrongHeader says what is wrong with the header of an answer to request, or "". It judges as soon as seven bytes are
// in, so that a wrong length is not waited for.
func wrongHeader(request, header []byte) string {
	if p := binary.BigEndian.Uint16(header[2:]); p != 0 {
		return fmt.Sprintf("answer with protocol %d, want 0", p)
	}
	length := int(binary.BigEndian.Uint16(header[4:]))
	whole := 3 + dataBytes(Function(request[7]), int(binary.BigEndian.Uint16(request[10:])))
	if length != exceptionBody && length != whole {
		return fmt.Sprintf("answer of length %d, want %d", length, whole)
	}
	if header[6] != request[6] {
		return fmt.Sprintf("answer of unit %d, want %d", header[6], request[6])
	}
	return ""
}

// wrongReply says what is wrong with a whole answer whose header is right, or "". The exception code is 0 for an answer
// with data.
func wrongReply(request, reply []byte) (exception byte, wrong string) {
	f := Function(request[7])
	quantity := int(binary.BigEndian.Uint16(request[10:]))
	want := dataBytes(f, quantity)
	switch {
	case reply[7] == byte(f)|0x80:
		if len(reply) != headerSize+2 {
			return 0, fmt.Sprintf("exception of %d bytes, want %d", len(reply), headerSize+2)
		}
		if reply[8] == 0 {
			return 0, "exception without a code"
		}
		return reply[8], ""
	case reply[7] != byte(f):
		return 0, fmt.Sprintf("answer to function %d, want %d", reply[7], byte(f))
	case len(reply) != headerSize+2+want:
		return 0, fmt.Sprintf("answer of %d bytes, want %d", len(reply), headerSize+2+want)
	case int(reply[8]) != want:
		return 0, fmt.Sprintf("answer with byte count %d, want %d", reply[8], want)
	}
	if f.readsBits() && quantity%8 != 0 && reply[len(reply)-1]>>(quantity%8) != 0 {
		return 0, "answer with padding bits set"
	}
	return 0, ""
}

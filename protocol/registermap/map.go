// Package registermap turns register words into readings.
//
// A [Map] is a list of [Point]s; start at [Point.Decode]. Within a register the high byte comes first (MODBUS Application
// Protocol V1.1b3, 4.2). That text says nothing of wider values, so each Point states its word order.
package registermap

import (
	"time"

	"chargehand/commission/signal"
)

// Format is the first line of every map file.
const Format = "chargehand-map/1"

// Table is one of the four tables of the Modbus data model.
type Table string

// The tables.
const (
	Holding  Table = "holding"
	Input    Table = "input"
	Coil     Table = "coil"
	Discrete Table = "discrete"
)

// FunctionCode is the read function of a table: 01 coils, 02 discrete inputs, 03 holding registers, 04 input registers.
func (t Table) FunctionCode() byte {
	switch t {
	case Coil:
		return 1
	case Discrete:
		return 2
	case Holding:
		return 3
	case Input:
		return 4
	}
	return 0
}

// HasBits tells whether the table holds single bits instead of registers.
func (t Table) HasBits() bool { return t == Coil || t == Discrete }

// Type is how a value stands in its registers.
type Type string

// The types.
const (
	U16 Type = "u16"
	I16 Type = "i16"
	U32 Type = "u32"
	I32 Type = "i32"
	U64 Type = "u64"
	I64 Type = "i64"
	F32 Type = "f32"
	F64 Type = "f64"
	Bit Type = "bit"
)

// Words is how many registers the type takes.
func (t Type) Words() int {
	switch t {
	case U32, I32, F32:
		return 2
	case U64, I64, F64:
		return 4
	}
	return 1
}

// Order is the order of words in a wide value, or of bytes in a word.
type Order string

// The orders.
const (
	HighFirst Order = "high-first"
	LowFirst  Order = "low-first"
)

// Address is a register's or a bit's place in its table, from 0, as on the wire.
type Address uint16

// Point is one signal of a map.
type Point struct {
	Name         signal.Name
	UnitID       uint8
	HasUnitID    bool // false: the device's own
	Table        Table
	Address      Address
	Type         Type
	BitNumber    int // of a register, 0 = least significant; used where Type is Bit and the table holds registers
	WordOrder    Order
	ByteOrder    Order // HighFirst unless the map says otherwise
	Scale        float64
	Offset       float64
	Unit         string  // as the map states it, "" for none
	UnitFactor   float64 // value in the stated unit times this is the value in signal.Name.Unit()
	SignReversed bool
	Range        *[2]float64       // plausible values, in the stated unit
	Missing      [][]uint16        // raw codes for 'no value', in wire order
	Values       map[int64]float64 // raw number to value, for Mode
	Line         int               // in the map file
}

// Map is the register map of one device.
type Map struct {
	WordOrder   Order
	MinInterval time.Duration // least time from a reply to the next request
	MaxBlock    int           // registers per request, 1…125
	MaxGap      int           // unused registers worth reading to join two blocks
	Points      []Point
}

// Find gives the point of a signal.
func (m Map) Find(n signal.Name) (Point, bool) {
	for _, p := range m.Points {
		if p.Name == n {
			return p, true
		}
	}
	return Point{}, false
}

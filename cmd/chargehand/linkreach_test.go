package main

import (
	"errors"
	"strings"
	"testing"

	"chargehand/protocol/link"
)

func TestNoAnswerTellsEveryKind(t *testing.T) {
	where := link.Where{Peer: "192.0.2.21:502", Unit: 5, Function: link.ReadHoldingRegisters, Address: 100, Quantity: 2}
	tests := []struct {
		err  error
		what string
		todo string
	}{
		{&link.ConnectError{Peer: "192.0.2.21:502", Kind: link.NoHost}, "no host: nothing answers at 192.0.2.21:502", "cable"},
		{&link.ConnectError{Peer: "192.0.2.21:502", Kind: link.NoService}, "no service:", "port"},
		{&link.ClosedError{Where: where, Fresh: true}, "connection taken:", "another client"},
		{&link.ClosedError{Where: where}, "connection lost:", "cable"},
		{&link.ExceptionError{Where: where, Code: 10}, "no unit: a gateway at 192.0.2.21:502 says that unit 5", "unit_id"},
		{&link.ExceptionError{Where: where, Code: 11}, "no unit: a gateway", "unit_id"},
		{&link.TimeoutError{Where: where, Clean: true}, "no unit, or silent:", "unit_id"},
		{&link.ExceptionError{Where: where, Code: 2}, "no register:", "addresses"},
		{&link.ExceptionError{Where: where, Code: 4}, "the device refuses:", "starting up"},
		{&link.MalformedError{Where: where, Why: "foreign"}, "wrong answer:", "Modbus TCP"},
		{&link.BackoffError{Cause: &link.ConnectError{Kind: link.NoHost}}, "no host:", "cable"},
		{errors.New("anything else"), "not sent:", "map"},
		{nil, "no answer", "address"},
	}
	for _, test := range tests {
		what, todo := noAnswer(test.err, "192.0.2.21:502", 5)
		if !strings.HasPrefix(what, test.what) || !strings.Contains(todo, test.todo) {
			t.Errorf("noAnswer(%T %v) = %q, %q, want %q, and what to do: %q", test.err, link.KindOf(test.err), what, todo, test.what, test.todo)
		}
	}
}

package link_test

import (
	"context"
	"fmt"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
)

func ExampleUnit_Read() {
	var device linktest.Image
	device.Set(1, 3, 100, 7124, 8150)
	server, err := linktest.Serve(device.Answer)
	if err != nil {
		fmt.Println(err)
		return
	}
	defer server.Close()

	l := link.New(link.Options{Address: server.Address()})
	defer l.Close()
	answer, err := l.Unit(1).Read(context.Background(), link.ReadHoldingRegisters, 100, 2)
	fmt.Println(answer.Words, err)

	device.Remove(1, 3, 101)
	_, err = l.Unit(1).Read(context.Background(), link.ReadHoldingRegisters, 100, 2)
	fmt.Println(link.KindOf(err))
	// Output:
	// [7124 8150] <nil>
	// no register
}

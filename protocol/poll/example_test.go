package poll_test

import (
	"context"
	"fmt"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
)

func ExamplePoller() {
	var device linktest.Image
	device.Set(1, 3, 100, 7124)
	server, err := linktest.Serve(device.Answer)
	if err != nil {
		fmt.Println(err)
		return
	}
	defer server.Close()
	l := link.New(link.Options{Address: server.Address()})
	defer l.Close()

	m := registermap.Map{Points: []registermap.Point{
		{Name: signal.BusVoltage, Table: registermap.Holding, Address: 100, Type: registermap.U16, Scale: 0.1}}}
	p := poll.New(poll.Options{Device: "aft string", Link: l, UnitID: 1, Map: m})
	batches := p.Batches()
	ctx, cancel := context.WithCancel(context.Background())
	go p.Run(ctx)
	r := (<-batches).Find(signal.BusVoltage)
	fmt.Printf("%s %.1f %s, %s\n", r.Name, r.Value, r.Name.Unit(), r.Quality)
	cancel()
	for range batches { // closed when Run has ended
	}
	// Output: bus-voltage 712.4 V, good
}

package scpi_test

import (
	"context"
	"errors"
	"fmt"
	"net"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

func ExampleConn() {
	// A meter made of a table stands for a real one; package wire would open that.
	meter := &acquiretest.Instrument{
		Identity: "Example Works,Meter 7,0042,1.3",
		Answers:  map[string]string{"MEASure:VOLTage?": "+4.80132E+01", "MEASure:TEMPerature?": "9.91E37"},
		Commands: map[string]string{"SOURce:VOLTage 9.9E+01": `-222,"Data out of range"`},
	}
	near, far := net.Pipe()
	go acquiretest.Talk(far, meter.Answer)

	conn, err := scpi.NewConn(near, scpi.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	defer conn.Close()
	ctx := context.Background()
	fmt.Println(conn.Identity(ctx))
	fmt.Println(conn.QueryNumber(ctx, "MEASure:VOLTage?"))
	_, err = conn.QueryNumber(ctx, "MEASure:TEMPerature?")
	fmt.Println(errors.Is(err, scpi.ErrNoReading))
	fmt.Println(conn.Command(ctx, "SOURce:VOLTage", scpi.Number(99)))
	// Output:
	// Example Works,Meter 7,0042,1.3 <nil>
	// 48.0132 <nil>
	// true
	// instrument error -222 "Data out of range" (execution error) after "SOURce:VOLTage 9.9E+01"
}

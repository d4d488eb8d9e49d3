package acquire_test

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/snubber"
)

func lines(verdicts []acquire.Verdict) string {
	var b strings.Builder
	for _, v := range verdicts {
		fmt.Fprintf(&b, "%s|%s|%s|%t|%s|%s\n", v.Instrument, v.What, v.Reply, v.OK, v.Problem, v.Cure)
	}
	return b.String()
}

func TestCheck(t *testing.T) {
	ctx := context.Background()
	good := scope()
	good.Answer("NONSENSE") // somebody left an error in the queue
	good.Answers["*TST?"] = "+0"
	good.Answers["FREQ?"], good.Sequence = "6.2E+7", nil
	bad := &acquiretest.Instrument{Identity: "Example Works,Meter 7,0042,1.3", Answers: map[string]string{
		"*TST?": "3", "VOLT?": "9.91E+37", "CURR?": "hello", "TEMP?": "21.5",
	}}
	rig := rigOf(acquiretest.Serve(t, good.Answer))
	rig.Instruments = append(rig.Instruments, acquire.Instrument{
		Name: "meter", Address: acquiretest.Serve(t, bad.Answer), Timeout: 200 * time.Millisecond,
		Readings: []acquire.Query{
			{Quantity: snubber.BusV, Query: "VOLT?"}, {Quantity: snubber.SupplyA, Query: "CURR?"}, {Quantity: snubber.CurrentA, Query: "WRONG?"}, {Quantity: snubber.TempC, Query: "TEMP?"},
		},
	}, acquire.Instrument{
		Name: "jig", Address: acquiretest.Serve(t, scope().Answer), NoErrorQueue: true, NoSelfTest: true,
	})
	s := openStation(t, rig)
	var told []acquire.Verdict
	got, err := s.Check(ctx, func(v acquire.Verdict) { told = append(told, v) })
	if err != nil || lines(told) != lines(got) {
		t.Errorf("%v\ntold %s", err, lines(told))
	}
	const manual = "check that the address is this instrument's, and what the rig file asks against its programming manual"
	want := `scope|identity|` + scopeID + `|true||
scope|self-test|+0|true||
scope|peak_v|9.5E+00|true||
scope|ring_hz|6.2E+7|true||
scope|error queue|0,"No error"|true|when it was opened it held, from before: -113,"Undefined header"|
meter|identity|Example Works,Meter 7,0042,1.3|true||
meter|self-test|3|false|its self-test says "3", and 0 would mean that nothing is wrong|its manual says what the number means
meter|bus_v|9.91E+37|false|no reading (the instrument answered "9.91E+37")|check its trigger, its range and the signal
meter|supply_a|hello|false|reply "hello" to "CURR?": not a number|` + manual + `
meter|current_a||false|instrument error -113 "Undefined header" (command error) after "WRONG?"|it does not know this message: check the rig file against its programming manual
meter|temp_c|21.5|true||
meter|error queue|0,"No error"|true||
jig|identity|` + scopeID + `|true||
jig|self-test||true|not asked for: self_test in the rig file|
jig|error queue||true|not asked for: error_queue = false in the rig file|
`
	if lines(got) != want {
		t.Errorf("%s\nwant\n%s", lines(got), want)
	}
	for _, v := range got {
		if (v.Reply != "") != (v.Took > 0) && v.Reply != "" {
			t.Errorf("%+v: it took no time", v)
		}
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := s.Check(cancelled, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// An instrument that cannot be opened is a verdict, and the others are checked all the same.
func TestCheckRig(t *testing.T) {
	good := scope()
	good.Answers["*TST?"] = "0"
	rig := rigOf(acquiretest.Serve(t, good.Answer))
	rig.Instruments = append([]acquire.Instrument{{Name: "gone", Address: "tcp://127.0.0.1:1"}}, rig.Instruments...)
	got, err := acquire.CheckRig(context.Background(), rig, nil)
	if err != nil {
		t.Fatal(err)
	}
	if all := lines(got); !strings.HasPrefix(all, "gone|open||false|connection refused, so nothing listens at port 1|check that the instrument's SCPI socket is switched on, and its port\nscope|open||true||\nscope|identity|") || len(got) != 7 {
		t.Error(all)
	}
	if _, err := acquire.CheckRig(context.Background(), acquire.Rig{}, nil); err == nil {
		t.Error("an empty rig was checked")
	}
}

package simbench_test

import (
	"math"
	"strings"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/simbench"
	"ringbook/snubber"
)

// TestRig: the program's own client reads every quantity through the rig file, over TCP and with the supply
// on a pseudo-terminal, and fits networks.
func TestRig(t *testing.T) {
	bench, err := simbench.Start(t.Context(), simbench.Default())
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	tty, err := bench.ServePTY("supply")
	if err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{
		"tcp": bench.RigTOML(),
		"pty": strings.Replace(bench.RigTOML(), bench.Address("supply"), "serial://"+tty, 1),
	} {
		t.Run(name, func(t *testing.T) {
			rig, err := acquire.ParseRig("rig.toml", []byte(text))
			if err != nil {
				t.Fatal(err)
			}
			station, err := acquire.Open(t.Context(), rig)
			if err != nil {
				t.Fatal(err)
			}
			defer station.Close()
			want := map[snubber.Quantity][2]float64{ // value, and how far off it may be
				snubber.RingHz:      {87.8e6, 0.3e6},
				snubber.DecayS:      {37.5e-9, 1e-9},
				snubber.PeakV:       {98.9, 1},
				snubber.BusV:        {48, 0.1},
				snubber.CurrentA:    {2.5, 0.005},
				snubber.SwitchingHz: {400e3, 20},
				snubber.SupplyA:     {0.26*2.5 + 400e3*48*262e-12, 0.01},
			}
			read := func(n snubber.Network) map[snubber.Quantity]snubber.Reading {
				t.Helper()
				if err := station.Fit(t.Context(), n); err != nil {
					t.Fatal(err)
				}
				got, err := station.Take(t.Context(), nil)
				if err != nil {
					t.Fatal(err)
				}
				readings := map[snubber.Quantity]snubber.Reading{}
				for _, r := range got.Readings {
					readings[r.Quantity] = r
				}
				return readings
			}
			bare := read(snubber.Network{Kind: snubber.Bare})
			for q, w := range want {
				r, ok := bare[q]
				if !ok || math.Abs(r.Value-w[0]) > w[1] || !(r.U > 0) || !strings.HasPrefix(r.Instrument, "RINGBOOK,SIMULATED ") {
					t.Errorf("%s: %+v, want %g +- %g", q, r, w[0], w[1])
				}
			}
			with := read(snubber.Network{Kind: snubber.C, C: 470e-12})
			if v := with[snubber.RingHz].Value; math.Abs(v-51.5e6) > 1e6 {
				t.Errorf("ring with 470 pF: %g Hz", v)
			}
			damped := read(snubber.Network{Kind: snubber.RC, C: 1e-9, R: 6.8})
			if _, ok := damped[snubber.RingHz]; ok || damped[snubber.PeakV].Value > 70 {
				t.Errorf("with a snubber: %+v", damped)
			}
			clamped := read(snubber.Network{Kind: snubber.RCD, C: 1e-9, R: 10})
			if v := clamped[snubber.PeakV].Value; math.Abs(v-81.4) > 1 {
				t.Errorf("peak with a diode across the resistor: %g V", v)
			}
		})
	}
}

// TestSwapThroughTheRig: the program's own client switches off, waits until the bus is safe, changes parts and switches
// on, and the bench finds no mistake in it; one who does not wait makes one.
func TestSwapThroughTheRig(t *testing.T) {
	cfg := simbench.Default()
	cfg.Bus.Speed = 20
	bench, err := simbench.Start(t.Context(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	rig, err := acquire.ParseRig("rig.toml", []byte(bench.RigTOML()))
	if err != nil {
		t.Fatal(err)
	}
	station, err := acquire.Open(t.Context(), rig)
	if err != nil {
		t.Fatal(err)
	}
	defer station.Close()
	if !station.CanSwitch() {
		t.Fatal("the rig switches no output")
	}
	var last float64
	for _, c := range []float64{100e-12, 1e-9} {
		if err := station.Switch(t.Context(), false); err != nil {
			t.Fatal(err)
		}
		if err := station.Discharged(t.Context(), cfg.Bus.SafeV, time.Minute, nil); err != nil {
			t.Fatal(err)
		}
		if err := station.Fit(t.Context(), snubber.Network{Kind: snubber.C, C: c}); err != nil {
			t.Fatal(err)
		}
		if err := station.Switch(t.Context(), true); err != nil {
			t.Fatal(err)
		}
		if v, err := station.Read(t.Context(), snubber.BusV); err != nil || math.Abs(v-48) > 0.1 {
			t.Errorf("after it has settled, the bus is at %g V, %v", v, err)
		}
		hz, err := station.Read(t.Context(), snubber.RingHz)
		if err != nil || hz == last {
			t.Errorf("ring %g Hz, %v", hz, err)
		}
		last = hz
	}
	if list := bench.Mistakes(); len(list) > 0 {
		t.Errorf("mistakes: %v", list)
	}
	if err := station.Switch(t.Context(), false); err != nil {
		t.Fatal(err)
	}
	if err := station.Fit(t.Context(), snubber.Network{Kind: snubber.Bare}); err != nil {
		t.Fatal(err)
	}
	if list := bench.Mistakes(); len(list) != 1 || list[0].BusV < 5 {
		t.Errorf("mistakes: %v, want one", list)
	}
}

// TestDrawerOfRelays: the drawer file names the card's capacitors, which the program's own client switches in, and the
// board rings lower each time. Nothing is changed on a live bus.
func TestDrawerOfRelays(t *testing.T) {
	cfg := simbench.Default()
	cfg.Bus.Speed = 100
	bench, err := simbench.Start(t.Context(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	rig, err := acquire.ParseRig("rig.toml", []byte(bench.RigTOML()))
	if err != nil {
		t.Fatal(err)
	}
	drawer, err := acquire.ParseDrawer("drawer.toml", []byte(bench.DrawerTOML()))
	if err != nil {
		t.Fatal(err)
	}
	if err := rig.Serves(drawer); err != nil || len(drawer.Capacitors) != 50 {
		t.Fatalf("%d capacitors, %v", len(drawer.Capacitors), err)
	}
	station, err := acquire.Open(t.Context(), rig)
	if err != nil {
		t.Fatal(err)
	}
	defer station.Close()
	do := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	safe := func() {
		t.Helper()
		do(station.Switch(t.Context(), false))
		do(station.Discharged(t.Context(), cfg.Bus.SafeV, time.Minute, nil))
	}
	last, before := math.Inf(1), acquire.Part{}
	for i, p := range drawer.Capacitors {
		if p.Value != bench.Relays()[i] || p.Tol != cfg.Parts.CTol {
			t.Errorf("part %d is %+v, want %g F", i+1, p, bench.Relays()[i])
		}
		if i%7 > 0 {
			continue
		}
		safe()
		if before.Switched() {
			do(station.SwitchPart(t.Context(), before, false))
		}
		before = p
		do(station.SwitchPart(t.Context(), p, true))
		do(station.Switch(t.Context(), true))
		hz, err := station.Read(t.Context(), snubber.RingHz)
		if err != nil || hz > 0.98*last {
			t.Errorf("%s of %g F: %g Hz after %g Hz, %v", p.Name, p.Value, hz, last, err)
		}
		last = hz
	}
	if list := bench.Mistakes(); len(list) > 0 {
		t.Errorf("mistakes: %v", list)
	}
}

package simbench

import (
	"fmt"
	"math"

	"ringbook/acquire/simbench/device"
)

// Heat is how warm the network gets, and the thermometer that sees it.
type Heat struct {
	AmbientC  float64 // degree Celsius, -273.15 to 1000
	RiseKPerW float64 // K/W, >= 0: rise over ambient per watt that ringing and network turn into heat
	ErrorK    float64 // K, >= 0: bound of the thermometer's own error
}

func (h Heat) check() error {
	switch {
	case !(h.AmbientC >= -273.15 && h.AmbientC <= 1000):
		return fmt.Errorf("ambient at %g degrees Celsius: it must lie in -273.15 to 1000", h.AmbientC)
	case !notNegative(h.RiseKPerW), !notNegative(h.ErrorK):
		return fmt.Errorf("heat of %g K/W, read to %g K: each must be zero or positive, and finite", h.RiseKPerW, h.ErrorK)
	}
	return nil
}

// newThermometer makes the thermometer.
//
//	MEASure:TEMPerature?    degree Celsius
func (b *Bench) newThermometer() (*device.Instrument, error) {
	return device.New("RINGBOOK,SIMULATED THERMOMETER,0,1", nil, []device.Command{
		{Header: "MEASure[:SCALar]:TEMPerature?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			c, err := b.temperatureC()
			if err != nil {
				return "", device.Errorf(-240, "%v", err)
			}
			bound := b.model.cfg.Heat.ErrorK
			return device.NR3(max(c+bound*(b.gains["thermometer"]+0.2*b.drift.NormFloat64()), -273.15), 6), nil
		}},
	})
}

// temperatureC is how warm the network is. The charge that node and network take up at the bus voltage in every cycle
// comes back at none, so its energy is heat:
//
//	T = ambient + rise f Q E
//
// Nothing takes time to warm up.
func (b *Bench) temperatureC() (float64, error) {
	h := b.model.cfg.Heat
	r, err := b.now()
	if r == nil {
		return h.AmbientC, err
	}
	watts := b.model.cfg.SwitchingHz * r.charge * b.busV()
	return h.AmbientC + h.RiseKPerW*math.Max(watts, 0), nil
}

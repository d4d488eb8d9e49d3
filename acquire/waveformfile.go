package acquire

import "fmt"

// waveformFile is [instrument.NAME.waveform]. What may be of two types is read as any.
type waveformFile struct {
	Take           any          `toml:"take"`
	Query          string       `toml:"query"`
	Format         string       `toml:"format"`
	ByteOrder      string       `toml:"byte_order"`
	Preamble       string       `toml:"preamble"`
	PreambleFields []string     `toml:"preamble_fields"`
	StartS         any          `toml:"start_s"`
	StartSample    any          `toml:"start_sample"`
	IntervalS      any          `toml:"interval_s"`
	ZeroV          any          `toml:"zero_v"`
	ZeroCode       any          `toml:"zero_code"`
	VoltPerCode    any          `toml:"volt_per_code"`
	Scale          *float64     `toml:"scale"`
	Accuracy       accuracyFile `toml:"accuracy"`
}

// waveform makes a description of it, or says which key is wrong.
func (f waveformFile) waveform() (w Waveform, key string, err error) {
	w = Waveform{Query: f.Query, Format: Format(f.Format), ByteOrder: ByteOrder(f.ByteOrder), Preamble: f.Preamble, PreambleFields: f.PreambleFields, Accuracy: Accuracy(f.Accuracy)}
	if w.Take, err = messages(f.Take); err != nil {
		return w, "take", err
	}
	given := map[string]any{
		"start_s": f.StartS, "start_sample": f.StartSample, "interval_s": f.IntervalS,
		"zero_v": f.ZeroV, "zero_code": f.ZeroCode, "volt_per_code": f.VoltPerCode,
	}
	for _, name := range scalings() {
		if given[name] == nil {
			continue
		}
		s, err := scaler(given[name])
		if err != nil {
			return w, name, err
		}
		if w.Scaling == nil {
			w.Scaling = map[string]Scaler{}
		}
		w.Scaling[name] = s
	}
	if f.Scale != nil {
		if w.Scale = *f.Scale; w.Scale == 0 {
			return w, "scale", fmt.Errorf("0: every sample would be nothing")
		}
	}
	return w, "", nil
}

// messages takes one message or a list of them.
func messages(value any) ([]string, error) {
	switch v := value.(type) {
	case nil:
		return nil, nil
	case string:
		return []string{v}, nil
	case []any:
		var all []string
		for _, m := range v {
			s, ok := m.(string)
			if !ok {
				return nil, fmt.Errorf("%v is no message: write each in quotes", m)
			}
			all = append(all, s)
		}
		return all, nil
	}
	return nil, fmt.Errorf("%v is no message: write it in quotes", value)
}

// scaler takes a number or a query.
func scaler(value any) (Scaler, error) {
	switch v := value.(type) {
	case int64:
		return Scaler{Value: float64(v)}, nil
	case float64:
		return Scaler{Value: v}, nil
	case string:
		if v == "" {
			return Scaler{}, fmt.Errorf("it is empty: give a number or a query, or take the key out")
		}
		return Scaler{Query: v}, nil
	}
	return Scaler{}, fmt.Errorf("%v: it must be a number, or the query that is answered with it", value)
}

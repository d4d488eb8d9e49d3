package store

import (
	"encoding/binary"
	"fmt"
	"math"
)

func pack(volts []float64) ([]byte, string) {
	data := make([]byte, 0, 8*len(volts))
	for _, v := range volts {
		data = binary.LittleEndian.AppendUint64(data, math.Float64bits(v))
	}
	return data, "standin"
}

func unpack(data []byte, encoding string) ([]float64, error) {
	if encoding != "standin" {
		return nil, fmt.Errorf("encoding %q is not known", encoding)
	}
	volts := make([]float64, len(data)/8)
	for i := range volts {
		volts[i] = math.Float64frombits(binary.LittleEndian.Uint64(data[8*i:]))
	}
	return volts, nil
}

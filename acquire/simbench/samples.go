package simbench

import (
	"encoding/binary"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"ringbook/acquire/simbench/device"
)

// sampleFormat is how the scope sends the samples of a capture.
type sampleFormat struct {
	kind    string // ASC, INT, UINT or REAL
	bits    int    // 0 for ASC
	swapped bool   // the least significant byte first
}

// startFormat is the format at the start and after *RST.
var startFormat = sampleFormat{kind: "UINT", bits: 8}

// layouts lists the kinds and widths there are, the first width being the one when none is given.
var layouts = map[string][]int{"ASC": {0}, "INT": {8, 16}, "UINT": {8, 16}, "REAL": {32}}

// samples makes the commands that hand out the capture kept.
//
//	CAPTure:FORMat kind[,bits]        ASCii | INTeger,8 | INTeger,16 | UINTeger,8 | UINTeger,16 | REAL,32
//	CAPTure:FORMat:BORDer NORMal      NORMal: the most significant byte first; SWAPped: the least
//
// The words and what they mean are those of SCPI-1999, Volume 2, chapter 9 (FORMat), from memory. Samples in 16 bits
// have the converter's eight in the upper byte; in ASCII and REAL they are volts, and ASCII is a line, not a block.
func (b *Bench) samples() []device.Command {
	return []device.Command{
		{Header: "CAPTure:PREamble?", Do: b.fromKept(func(c Capture, f sampleFormat) string {
			perCode, lowest := f.codes(c)
			return fmt.Sprintf("%d,%s,%s,%s,%s,%d", len(c.Codes), device.NR3(c.StartS, 17), device.NR3(c.StepS, 17),
				device.NR3(c.BottomV, 17), device.NR3(perCode, 17), lowest)
		})},
		{Header: "CAPTure:DATA?", Do: b.fromKept(func(c Capture, f sampleFormat) string { return f.reply(c) })},
		{Header: "CAPTure:FORMat", Min: 1, Max: 2, Do: b.setFormat},
		{Header: "CAPTure:FORMat?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			if b.format.kind == "ASC" {
				return "ASC", nil
			}
			return b.format.kind + "," + strconv.Itoa(b.format.bits), nil
		}},
		{Header: "CAPTure:FORMat:BORDer", Min: 1, Max: 1, Do: func(args []device.Arg) (string, error) {
			word, err := args[0].Word()
			if err != nil {
				return "", err
			}
			swapped := word == "SWAP" || word == "SWAPPED"
			if !swapped && word != "NORM" && word != "NORMAL" {
				return "", device.Errorf(-224, "%s is neither NORMal nor SWAPped", word)
			}
			b.mu.Lock()
			defer b.mu.Unlock()
			b.format.swapped = swapped
			return "", nil
		}},
		{Header: "CAPTure:FORMat:BORDer?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			if b.format.swapped {
				return "SWAP", nil
			}
			return "NORM", nil
		}},
	}
}

// setFormat runs CAPTure:FORMat.
func (b *Bench) setFormat(args []device.Arg) (string, error) {
	word, err := args[0].Word()
	if err != nil {
		return "", err
	}
	kind := map[string]string{"ASCII": "ASC", "INTEGER": "INT", "UINTEGER": "UINT"}[word]
	if kind == "" {
		kind = word
	}
	widths, ok := layouts[kind]
	if !ok {
		return "", device.Errorf(-224, "%s is none of ASCii, INTeger, UINTeger and REAL", word)
	}
	bits := widths[0]
	if len(args) > 1 {
		v, err := args[1].Number()
		if err != nil {
			return "", err
		}
		if !slices.Contains(widths, int(v)) || v != math.Trunc(v) {
			return "", device.Errorf(-224, "%s of %g bits", word, v)
		}
		bits = int(v)
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	b.format.kind, b.format.bits = kind, bits
	return "", nil
}

// codes gives the volts per code and the lowest code of a capture sent in this format. ASCII and REAL have no codes:
// there it is what the converter's are.
func (f sampleFormat) codes(c Capture) (voltPerCode float64, lowest int) {
	voltPerCode = c.VoltsPerBit
	if f.bits == 16 {
		voltPerCode /= 256
	}
	if f.kind == "INT" {
		lowest = -1 << (f.bits - 1)
	}
	return voltPerCode, lowest
}

// reply writes the samples of a capture.
func (f sampleFormat) reply(c Capture) string {
	if f.kind == "ASC" {
		var b strings.Builder
		for i, v := range c.Volts() {
			if i > 0 {
				b.WriteByte(',')
			}
			b.WriteString(device.NR3(v, 17))
		}
		return b.String()
	}
	var order binary.AppendByteOrder = binary.BigEndian
	if f.swapped {
		order = binary.LittleEndian
	}
	_, lowest := f.codes(c)
	var data []byte
	for _, code := range c.Codes {
		switch f.bits {
		case 8:
			data = append(data, byte(int(code)+lowest))
		case 16:
			data = order.AppendUint16(data, uint16(int(code)<<8+lowest))
		case 32:
			data = order.AppendUint32(data, math.Float32bits(float32(c.BottomV+c.VoltsPerBit*float64(code))))
		}
	}
	return device.Block(data)
}

package waveform

import (
	"bytes"
	"compress/flate"
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"io"
	"math"
)

// The encodings that Pack gives, by name.
const (
	// LevelsEncoding is for samples of at most 65,536 levels, as a converter of up to 16 bits gives: the levels, rising, then
	// each sample's place among them.
	LevelsEncoding = "levels+deflate"
	// PlanesEncoding is for all others: each sample's bits against those of the sample before, the lowest bytes of all
	// samples first.
	PlanesEncoding = "planes+deflate"
)

const (
	packMark    = "rbv\x01" // what it is, and its version
	planesForm  = 0
	levelsForm  = 1 // plus the order of the differences: 1, 2 or 3
	packBlock   = 1 << 16
	mostPerByte = 1040 // no deflate stream gives more bytes per byte: RFC 1951 allows 258 for two bits, and a little
)

var crcTable = crc32.MakeTable(crc32.Castagnoli)

// Pack encodes samples without loss: Unpack gives the same bits, of -0 too. The samples are finite, as a Record's are.
//
// The data begin with what is needed to read them: a mark with the version, the form, the number of samples as a varint and
// a CRC-32C of their bits. A deflate stream follows (RFC 1951). What a converter of 8 to 16 bits gave is found by its few
// levels, whatever arithmetic made volts of its codes, and takes a byte or two for each sample before deflate.
func Pack(volts []float64) (data []byte, encoding string, err error) {
	if len(volts) > MaxSamples {
		return nil, "", fmt.Errorf("packing %d samples: at most %d; cut the record to the part around the edge", len(volts), MaxSamples)
	}
	for i, v := range volts {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, "", fmt.Errorf("packing sample %d of %d, which is %g V: only finite samples are kept", i+1, len(volts), v)
		}
	}
	levels, ranks := findLevels(volts)
	var out bytes.Buffer
	out.WriteString(packMark)
	form, encoding, level := byte(planesForm), PlanesEncoding, flate.BestSpeed
	if levels != nil {
		order := bestOrder(ranks, len(levels))
		differences(ranks, order, len(levels))
		form, encoding, level = levelsForm+byte(order), LevelsEncoding, 6
		if len(volts) > 1<<20 {
			level = 3 // a fifth larger, three times as fast
		}
	}
	out.WriteByte(form)
	out.Write(binary.AppendUvarint(nil, uint64(len(volts))))
	out.Write(binary.LittleEndian.AppendUint32(nil, checksum(volts)))
	z, err := flate.NewWriter(&out, level)
	if err != nil {
		return nil, "", fmt.Errorf("packing samples: %w", err)
	}
	if levels != nil {
		err = writeLevels(z, levels, ranks)
	} else {
		err = writePlanes(z, volts)
	}
	if err = errors.Join(err, z.Close()); err != nil {
		return nil, "", fmt.Errorf("packing samples: %w", err)
	}
	return out.Bytes(), encoding, nil
}

// Unpack is the samples that Pack encoded, to the bit. Damaged data are an error, found by the checksum where by nothing else;
// they take no more memory than data of their length can ask for: 1040 samples for each byte, and MaxSamples.
func Unpack(data []byte, encoding string) ([]float64, error) {
	fail := func(format string, args ...any) ([]float64, error) {
		return nil, fmt.Errorf("unpacking %d bytes of %q: %w", len(data), encoding, fmt.Errorf(format, args...))
	}
	if encoding != LevelsEncoding && encoding != PlanesEncoding {
		return fail("the encoding is not known: it is %q or %q", LevelsEncoding, PlanesEncoding)
	}
	body, ok := bytes.CutPrefix(data, []byte(packMark))
	if !ok || len(body) == 0 {
		return fail("they do not begin as packed samples do: they are damaged, or of a later version")
	}
	form := body[0]
	n, size := binary.Uvarint(body[1:])
	if size <= 0 || len(body) < 1+size+4 {
		return fail("they end within their first bytes: they are damaged")
	}
	if (form == planesForm) != (encoding == PlanesEncoding) || form > levelsForm+maxOrder {
		return fail("they are of form %d, which is not of this encoding: they are damaged, or kept under a wrong name", form)
	}
	want, packed := binary.LittleEndian.Uint32(body[1+size:]), body[1+size+4:]
	least := uint64(1)
	if form == planesForm {
		least = 8
	}
	if n > MaxSamples || n*least > uint64(len(packed))*mostPerByte {
		return fail("they say they hold %d samples, which so few bytes cannot: they are damaged", n)
	}
	z := flate.NewReader(bytes.NewReader(packed))
	volts := make([]float64, n)
	var err error
	if form == planesForm {
		err = readPlanes(z, volts)
	} else {
		err = readLevels(z, volts, int(form-levelsForm))
	}
	if err == nil {
		var one [1]byte
		if _, err = io.ReadFull(z, one[:]); err == nil {
			err = errors.New("more follows the last sample")
		} else if err == io.EOF {
			err = nil
		}
	}
	if err != nil {
		return fail("%w: they are damaged", err)
	}
	if got := checksum(volts); got != want {
		return fail("the samples' checksum is %08x and should be %08x: they are damaged", got, want)
	}
	return volts, nil
}

// checksum of the samples' bits, lowest byte first.
func checksum(volts []float64) uint32 {
	var block [packBlock]byte
	sum := uint32(0)
	for len(volts) > 0 {
		part := volts[:min(len(volts), packBlock/8)]
		for i, v := range part {
			binary.LittleEndian.PutUint64(block[8*i:], math.Float64bits(v))
		}
		sum = crc32.Update(sum, crcTable, block[:8*len(part)])
		volts = volts[len(part):]
	}
	return sum
}

// writePlanes writes byte 0 of each sample's bits XOR those before, then byte 1 of each, up to byte 7.
func writePlanes(w io.Writer, volts []float64) error {
	var block [packBlock]byte
	for shift := 0; shift < 64; shift += 8 {
		last, fill := uint64(0), 0
		for _, v := range volts {
			now := math.Float64bits(v)
			block[fill] = byte((now ^ last) >> shift)
			last = now
			if fill++; fill == len(block) {
				if _, err := w.Write(block[:]); err != nil {
					return err
				}
				fill = 0
			}
		}
		if _, err := w.Write(block[:fill]); err != nil {
			return err
		}
	}
	return nil
}

func readPlanes(r io.Reader, volts []float64) error {
	var block [packBlock]byte
	for shift := 0; shift < 64; shift += 8 {
		for from := 0; from < len(volts); from += len(block) {
			part := volts[from:min(len(volts), from+len(block))]
			if _, err := io.ReadFull(r, block[:len(part)]); err != nil {
				return cutOff(err)
			}
			for i, b := range block[:len(part)] {
				part[i] = math.Float64frombits(math.Float64bits(part[i]) | uint64(b)<<shift)
			}
		}
	}
	last := uint64(0)
	for i, v := range volts {
		last ^= math.Float64bits(v)
		volts[i] = math.Float64frombits(last)
	}
	return nil
}

func cutOff(err error) error {
	if err == io.EOF || err == io.ErrUnexpectedEOF {
		return errors.New("they end before the last sample")
	}
	return err
}

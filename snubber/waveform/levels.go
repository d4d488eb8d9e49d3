package waveform

import (
	"bufio"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"math/bits"
	"slices"
)

// maxLevels is what a 16-bit converter gives.
const maxLevels = 1 << 16

// ordered maps the bits of finite numbers to integers in the order of the numbers, -0 next below +0.
func ordered(v float64) uint64 {
	b := math.Float64bits(v)
	if b>>63 != 0 {
		return ^b
	}
	return b | 1<<63
}

func unordered(k uint64) float64 {
	if k>>63 != 0 {
		return math.Float64frombits(k &^ (1 << 63))
	}
	return math.Float64frombits(^k)
}

// findLevels is the levels that the samples take, rising, and each sample's place among them; nil where they are too many,
// or so many beside the samples that to list them saves nothing.
func findLevels(volts []float64) (levels []float64, ranks []uint16) {
	var (
		most  = min(maxLevels, max(16, len(volts)/4))
		width = bits.Len(uint(2 * most))
		table = make([]int32, 1<<width) // a place in found, plus 1
		found []uint64
		place = make([]uint16, 0, len(volts))
	)
	for _, v := range volts {
		key := ordered(v)
		slot := key * 0x9e3779b97f4a7c15 >> (64 - width) // Fibonacci hashing
		for table[slot] != 0 && found[table[slot]-1] != key {
			slot = (slot + 1) % uint64(len(table))
		}
		if table[slot] == 0 {
			if len(found) == most {
				return nil, nil
			}
			found = append(found, key)
			table[slot] = int32(len(found))
		}
		place = append(place, uint16(table[slot]-1))
	}
	sorted := slices.Sorted(slices.Values(found))
	rank := make([]uint16, len(found))
	for i, key := range found {
		at, _ := slices.BinarySearch(sorted, key)
		rank[i] = uint16(at)
	}
	for i, p := range place {
		place[i] = rank[p]
	}
	levels = make([]float64, len(sorted))
	for i, key := range sorted {
		levels[i] = unordered(key)
	}
	return levels, place
}

// maxOrder is the highest order of differences between ranks that is tried. Differences are small where the voltage is
// smooth; where noise is most of it they only add to it.
const maxOrder = 2

// bestOrder is the order whose differences have the least entropy, by count.
func bestOrder(ranks []uint16, levels int) int {
	best, least := 0, math.Inf(1)
	mask := uint16(1<<16 - 1)
	if levels <= 256 {
		mask = 255
	}
	counts := make([]int, int(mask)+1)
	for order := range maxOrder + 1 {
		clear(counts)
		var d1, d2 uint16
		for _, r := range ranks {
			x := r
			if order > 0 {
				x, d1 = x-d1, x
			}
			if order > 1 {
				x, d2 = x-d2, x
			}
			counts[x&mask]++
		}
		total := 0.0
		for _, n := range counts {
			if n > 0 {
				total += float64(n) * math.Log2(float64(len(ranks))/float64(n))
			}
		}
		if total < least {
			best, least = order, total
		}
	}
	return best
}

// differences puts differences in place of ranks, order times. They wrap, and so does their sum. Where they take two bytes they
// are folded to 0, -1, 1, -2 ... as 0, 1, 2, 3: the high byte of small ones is then always 0.
func differences(ranks []uint16, order, levels int) {
	for range order {
		last := uint16(0)
		for i, r := range ranks {
			ranks[i], last = r-last, r
		}
	}
	if order > 0 && levels > 256 {
		for i, r := range ranks {
			ranks[i] = r<<1 ^ -(r >> 15)
		}
	}
}

// undifferences is its inverse.
func undifferences(ranks []uint16, order, levels int) {
	if order > 0 && levels > 256 {
		for i, r := range ranks {
			ranks[i] = r>>1 ^ -(r & 1)
		}
	}
	for range order {
		last := uint16(0)
		for i, d := range ranks {
			last += d
			ranks[i] = last
		}
	}
}

// writeLevels writes the levels, then the low bytes of all ranks, then, above 256 levels, their high bytes.
//
// The levels stand as their number, the lowest and the least step, then for each further one how many steps it lies above the
// one before and by how many float64 it then misses: mostly 1 and a few, whatever arithmetic made volts of codes.
func writeLevels(w io.Writer, levels []float64, ranks []uint16) error {
	head := binary.AppendUvarint(nil, uint64(len(levels)))
	if len(levels) > 0 {
		step := leastStep(levels)
		head = binary.LittleEndian.AppendUint64(head, math.Float64bits(levels[0]))
		head = binary.LittleEndian.AppendUint64(head, math.Float64bits(step))
		for i, v := range levels[1:] {
			steps := uint64(0)
			if n := math.Round((v - levels[i]) / step); n < 1<<32 { // false for NaN
				steps = uint64(n)
			}
			head = binary.AppendUvarint(head, steps)
			head = binary.AppendVarint(head, int64(ordered(v)-ordered(stepsAbove(levels[i], step, steps))))
		}
	}
	if _, err := w.Write(head); err != nil {
		return err
	}
	var block [packBlock]byte
	for shift := 0; shift == 0 || shift == 8 && len(levels) > 256; shift += 8 {
		for from := 0; from < len(ranks); from += len(block) {
			part := ranks[from:min(len(ranks), from+len(block))]
			for i, r := range part {
				block[i] = byte(r >> shift)
			}
			if _, err := w.Write(block[:len(part)]); err != nil {
				return err
			}
		}
	}
	return nil
}

func readLevels(z io.Reader, volts []float64, order int) error {
	r := bufio.NewReaderSize(z, packBlock)
	n, err := binary.ReadUvarint(r)
	if err != nil {
		return cutOff(err)
	}
	if n > maxLevels || (n == 0) != (len(volts) == 0) {
		return fmt.Errorf("they say they have %d levels", n)
	}
	var levels []float64
	if n > 0 {
		var ends [16]byte
		if _, err := io.ReadFull(r, ends[:]); err != nil {
			return cutOff(err)
		}
		step := math.Float64frombits(binary.LittleEndian.Uint64(ends[8:]))
		levels = append(levels, math.Float64frombits(binary.LittleEndian.Uint64(ends[:8])))
		for len(levels) < int(n) {
			steps, err := binary.ReadUvarint(r)
			if err != nil {
				return cutOff(err)
			}
			off, err := binary.ReadVarint(r)
			if err != nil {
				return cutOff(err)
			}
			levels = append(levels, unordered(ordered(stepsAbove(levels[len(levels)-1], step, steps))+uint64(off)))
		}
	}
	ranks := make([]uint16, len(volts))
	for shift := 0; shift == 0 || shift == 8 && n > 256; shift += 8 {
		for i := range ranks {
			b, err := r.ReadByte()
			if err != nil {
				return cutOff(err)
			}
			ranks[i] |= uint16(b) << shift
		}
	}
	undifferences(ranks, order, int(n))
	for i, rank := range ranks {
		if n <= 256 {
			rank &= 255
		}
		if int(rank) >= len(levels) {
			return errors.New("a sample is above the highest level")
		}
		volts[i] = levels[rank]
	}
	if _, err := r.ReadByte(); err != io.EOF {
		if err == nil {
			err = errors.New("more follows the last sample")
		}
		return err
	}
	return nil
}

// leastStep between levels; 0 where there is none that float64 holds.
func leastStep(levels []float64) float64 {
	least := math.Inf(1)
	for i := 1; i < len(levels); i++ {
		if d := levels[i] - levels[i-1]; d > 0 {
			least = min(least, d)
		}
	}
	if math.IsInf(least, 1) {
		return 0
	}
	return least
}

// stepsAbove must give the same bits on every machine: the conversion keeps it from being fused into one rounding.
func stepsAbove(v, step float64, steps uint64) float64 {
	if up := v + float64(step*float64(steps)); up-up == 0 {
		return up
	}
	return v
}

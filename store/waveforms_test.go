package store

import (
	"context"
	"errors"
	"iter"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// captured is a ring of n samples as an 8-bit converter gives it, with a step of 0.4 V and noise of as much (standard
// deviation): the same at every call.
func captured(n int) waveform.Record {
	const step = 0.4
	r := waveform.Record{Start: -1e-7, Interval: 4e-10, Volts: make([]float64, n), StepV: step, Origin: "Larkspur Works,Scope 4,0007,1.2"}
	random := rand.New(rand.NewPCG(5, 4))
	for i := range r.Volts {
		v := step * random.NormFloat64()
		if t := r.TimeAt(i); t > 0 {
			v += 48 - 30*math.Exp(-t/3e-7)*math.Cos(2*math.Pi*28e6*t)
		}
		r.Volts[i] = step * math.Round(v/step)
	}
	return r
}

// withWaveforms is a trial like example whose ring was read from the records it comes with.
func withWaveforms() (snubber.Trial, []waveform.Record) {
	t := example()
	t.Readings[0].FromWaveform, t.Readings[2].FromWaveform = true, true
	second := captured(300)
	second.Start, second.StepV, second.Origin = 0, 0, ""
	return t, []waveform.Record{captured(1000), second}
}

func mustAddWithWaveforms(t testing.TB, lb *Logbook) (id string, records []waveform.Record) {
	t.Helper()
	trial, records := withWaveforms()
	id, err := lb.AddWithWaveforms(t.Context(), trial, records)
	if err != nil {
		t.Fatal(err)
	}
	return id, records
}

func waveforms(t testing.TB, lb *Logbook, trial string) (all []Waveform) {
	t.Helper()
	for w, err := range lb.Waveforms(t.Context(), trial) {
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, w)
	}
	return all
}

func firstError(all iter.Seq2[Waveform, error]) error {
	for _, err := range all {
		if err != nil {
			return err
		}
	}
	return nil
}

func TestWaveformsAreKept(t *testing.T) {
	lb := openTemp(t)
	other := mustAdd(t, lb, example())
	id, want := mustAddWithWaveforms(t, lb)
	mustAddWithWaveforms(t, lb)
	if err := lb.Strike(t.Context(), id, "the clip slipped"); err != nil {
		t.Fatal(err)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	again, err := OpenReadOnly(t.Context(), lb.Path())
	if err != nil {
		t.Fatal(err)
	}
	defer again.Close()
	got := waveforms(t, again, ShortID(id)) // struck or not, and named by the end of its id
	if len(got) != 2 {
		t.Fatalf("%d waveforms, want 2", len(got))
	}
	for i, w := range got {
		if diff := cmp.Diff(want[i], w.Record); diff != "" {
			t.Errorf("waveform %d (-want +got):\n%s", i+1, diff)
		}
		if w.TrialID != id || len(w.ID) != 36 || w.ID == got[1-i].ID {
			t.Errorf("waveform %d is %s of trial %s, want of %s", i+1, w.ID, w.TrialID, id)
		}
	}
	trial, err := again.Trial(t.Context(), id)
	if err != nil {
		t.Fatal(err)
	}
	for i, r := range trial.Readings {
		if r.FromWaveform != (i == 0 || i == 2) {
			t.Errorf("%s: from a waveform: %v", r.Quantity, r.FromWaveform)
		}
	}
	if got := waveforms(t, again, other); len(got) != 0 {
		t.Errorf("%d waveforms of a trial without", len(got))
	}
	if err := firstError(again.Waveforms(t.Context(), "0123456789ab")); !errors.Is(err, ErrNoTrial) {
		t.Errorf("waveforms of no trial: %v", err)
	}
	ended, cancel := context.WithCancel(t.Context())
	cancel()
	if err := firstError(again.Waveforms(ended, id)); !errors.Is(err, context.Canceled) {
		t.Errorf("after the end of the context: %v", err)
	}
	if err := firstError(lb.Waveforms(t.Context(), id)); err == nil || !strings.Contains(err.Error(), "closed") {
		t.Errorf("of a closed logbook: %v", err)
	}
	trialWith, records := withWaveforms()
	if _, err := again.AddWithWaveforms(t.Context(), trialWith, records); !errors.Is(err, ErrReadOnly) {
		t.Errorf("added to a logbook open for reading alone: %v", err)
	}
}

func TestWaveformRoundTrip(t *testing.T) {
	lb := openTemp(t)
	rapid.Check(t, func(rt *rapid.T) {
		finite := rapid.Float64Range(-math.MaxFloat64, math.MaxFloat64)
		stepped := rapid.Custom(func(rt *rapid.T) float64 { return float64(rapid.IntRange(-128, 127).Draw(rt, "code")) * 0.04 })
		volts := rapid.OneOf(rapid.SliceOfN(finite, 1, 50), rapid.SliceOfN(stepped, 1, 500),
			rapid.SliceOfN(rapid.SampledFrom([]float64{0, math.Copysign(0, -1), math.SmallestNonzeroFloat64, math.MaxFloat64}), 1, 50))
		want := waveform.Record{
			Start:    finite.Draw(rt, "start"),
			Interval: rapid.Float64Range(math.SmallestNonzeroFloat64, math.MaxFloat64).Draw(rt, "interval"),
			StepV:    rapid.Float64Range(0, math.MaxFloat64).Draw(rt, "step"),
			Volts:    volts.Draw(rt, "volts"),
			Origin:   rapid.StringOf(rapid.RuneFrom([]rune("ab ß/\\.,\n\t"))).Draw(rt, "origin"),
		}
		id, err := lb.AddWithWaveforms(context.Background(), example(), []waveform.Record{want})
		if err != nil {
			rt.Fatal(err)
		}
		n := 0
		for got, err := range lb.Waveforms(context.Background(), id) {
			if err != nil {
				rt.Fatal(err)
			}
			n++
			if !slices.EqualFunc(want.Volts, got.Volts, func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }) {
				rt.Fatalf("volts %v, want %v", got.Volts, want.Volts)
			}
			got.Volts = want.Volts
			if diff := cmp.Diff(want, got.Record); diff != "" {
				rt.Fatal("(-want +got):\n" + diff)
			}
		}
		if n != 1 {
			rt.Fatalf("%d waveforms", n)
		}
	})
}

// A waveform that cannot be read is refused with its trial.
func TestBadWaveformsLogNothing(t *testing.T) {
	lb := openTemp(t)
	for _, c := range []struct {
		spoil func(*waveform.Record)
		says  string
	}{
		{func(r *waveform.Record) { r.Volts = nil }, "waveform 2: the record is empty"},
		{func(r *waveform.Record) { r.Volts[4] = math.NaN() }, "waveform 2: sample 5 of the record"},
		{func(r *waveform.Record) { r.Interval = 0 }, "interval of 0 s"},
		{func(r *waveform.Record) { r.Origin = "a\x00b" }, "waveform 2: origin: it has a control character"},
		{func(r *waveform.Record) { r.Origin = strings.Repeat("a", maxText+1) }, "origin: it has 1000001 bytes"},
	} {
		trial, records := withWaveforms()
		c.spoil(&records[1])
		if _, err := lb.AddWithWaveforms(t.Context(), trial, records); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%v; want %q", err, c.says)
		}
	}
	trial, records := withWaveforms()
	trial.Board = ""
	if _, err := lb.AddWithWaveforms(t.Context(), trial, records); err == nil || !strings.Contains(err.Error(), "board") {
		t.Errorf("a trial without a board: %v", err)
	}
	trial, records = withWaveforms()
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := lb.AddWithWaveforms(ctx, trial, records); !errors.Is(err, context.Canceled) {
		t.Errorf("after the end of the context: %v", err)
	}
	var n int
	if err := lb.db.QueryRowContext(t.Context(), "SELECT (SELECT count(*) FROM trial) + (SELECT count(*) FROM waveform)").Scan(&n); err != nil || n != 0 {
		t.Errorf("%d rows, %v; want none", n, err)
	}
}

// A waveform spoilt on the disk is named with its trial; the others are read.
func TestDamagedWaveform(t *testing.T) {
	for name, c := range map[string]struct{ set, says string }{
		"samples":  {"samples = CAST(substr(samples, 1, 20) || x'ff' || substr(samples, 22) AS BLOB)", "SHA-256"},
		"shorter":  {"samples = substr(samples, 1, length(samples) - 1)", "SHA-256"},
		"digest":   {"sha256 = zeroblob(32)", "SHA-256"},
		"encoding": {"encoding = 'thumbprint'", "thumbprint"},
		"interval": {"interval_s = -interval_s", "interval"},
	} {
		t.Run(name, func(t *testing.T) {
			lb := openTemp(t)
			id, want := mustAddWithWaveforms(t, lb)
			bad := waveforms(t, lb, id)[0].ID
			err := execOn(t, lb.Path(), "PRAGMA ignore_check_constraints = 1; DROP TRIGGER waveform_stays; UPDATE waveform SET "+c.set+" WHERE id = '"+bad+"'")
			if err != nil {
				t.Fatal(err)
			}
			n := 0
			for w, err := range lb.Waveforms(t.Context(), id) {
				switch n++; n {
				case 1:
					if !errors.Is(err, ErrDamaged) || w.ID != bad || w.TrialID != id || w.Volts != nil {
						t.Fatalf("waveform %s of trial %s with %d samples, %v", w.ID, w.TrialID, len(w.Volts), err)
					}
					for _, says := range []string{"waveform " + bad + " of trial " + id, c.says, "backup", lb.Path()} {
						if !strings.Contains(err.Error(), says) || strings.Contains(err.Error(), "\n") {
							t.Errorf("error %q lacks %q", err, says)
						}
					}
				case 2:
					if diff := cmp.Diff(want[1], w.Record); err != nil || diff != "" {
						t.Errorf("the sound one: %v, %s", err, diff)
					}
				}
			}
			if n != 2 {
				t.Errorf("%d waveforms, want 2", n)
			}
		})
	}
}

func TestWaveformsAreNeverChanged(t *testing.T) {
	lb := openTemp(t)
	mustAddWithWaveforms(t, lb)
	for _, script := range []string{
		"UPDATE waveform SET step_v = 1", "DELETE FROM waveform", "UPDATE reading SET from_waveform = NULL",
		"REPLACE INTO waveform SELECT * FROM waveform",
	} {
		if err := execOn(t, lb.Path(), script); err == nil || !strings.Contains(err.Error(), "strike its trial") {
			t.Errorf("%s: %v", script, err)
		}
	}
}

func TestDigestTellsReadingsFromWaveforms(t *testing.T) {
	trial := example()
	was := TrialsDigest([]snubber.Trial{trial})
	trial.Readings[2].FromWaveform = true
	if TrialsDigest([]snubber.Trial{trial}) == was {
		t.Error("one digest for a peak of the instrument's and one computed from samples")
	}
}

func TestCSVNamesReadingsFromWaveforms(t *testing.T) {
	const head = "from_waveform,board,revision,network,ring_hz,decay_s,peak_v\n"
	got, err := readAll(ReadCSV(strings.NewReader(head + "peak_v  ring_hz,A,1,bare,1.8M,900n,71\n")))
	if err != nil || !got[0].Readings[0].FromWaveform || got[0].Readings[1].FromWaveform || !got[0].Readings[2].FromWaveform {
		t.Errorf("%+v, %v", got, err)
	}
	_, err = readAll(ReadCSV(strings.NewReader(head + "peak_v,A,1,bare,1.8M,900n,\n")))
	if err == nil || !strings.Contains(err.Error(), `line 2, column 1 (from_waveform): "peak_v" has no reading`) {
		t.Errorf("a peak that was not read: %v", err)
	}
}

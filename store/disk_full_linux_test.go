package store

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"

	"ringbook/snubber/waveform"
)

// disk is a file system in memory of two megabytes, that a test can fill. Only root may mount one.
type disk struct {
	testing.TB
	folder string
}

func smallDisk(t testing.TB) disk {
	t.Helper()
	d := disk{t, t.TempDir()}
	if err := syscall.Mount("tmpfs", d.folder, "tmpfs", 0, "size=2m"); err != nil {
		t.Skipf("a disk to fill cannot be mounted here: %v", err)
	}
	t.Cleanup(func() {
		if err := syscall.Unmount(d.folder, syscall.MNT_DETACH); err != nil { // a failed test may have it in use
			t.Error(err)
		}
	})
	return d
}

func (d disk) path(name string) string { return filepath.Join(d.folder, name) }

// fill takes all room but free bytes.
func (d disk) fill(free int64) {
	d.Helper()
	f, err := os.Create(d.path("other files"))
	if err != nil {
		d.Fatal(err)
	}
	defer f.Close()
	var all int64
	for page := make([]byte, 4096); ; {
		n, err := f.Write(page)
		all += int64(n)
		if errors.Is(err, syscall.ENOSPC) {
			break
		}
		if err != nil {
			d.Fatal(err)
		}
	}
	if err := f.Truncate(max(all-free, 0)); err != nil {
		d.Fatal(err)
	}
}

func (d disk) empty() {
	if err := os.Remove(d.path("other files")); err != nil {
		d.Fatal(err)
	}
}

// names are all files but the ones that fill.
func (d disk) names() []string {
	entries, err := os.ReadDir(d.folder)
	if err != nil {
		d.Fatal(err)
	}
	var all []string
	for _, e := range entries {
		if e.Name() != "other files" {
			all = append(all, e.Name())
		}
	}
	return all
}

func (d disk) open(name string) *Logbook {
	d.Helper()
	lb, err := Open(d.Context(), d.path(name))
	if err != nil {
		d.Fatal(err)
	}
	return lb
}

// saysFull is whether err tells a person that the disk is full, in a sentence.
func saysFull(t testing.TB, err error) {
	t.Helper()
	if !errors.Is(err, ErrFull) || !strings.Contains(err.Error(), "the disk is full; make room and try again; nothing was written") ||
		strings.Contains(err.Error(), "\n") {
		t.Errorf("the error on a full disk: %v", err)
	}
}

// TestDiskFullWhileWriting gives a write more room from try to try, until it has enough: before that the logbook is what it
// was, on the full disk and after.
func TestDiskFullWhileWriting(t *testing.T) {
	other := bench(t, 300)
	older := version(t, 3)
	trial, records := withWaveforms()
	noise := captured(4000)
	for i := range noise.Volts { // does not pack well
		noise.Volts[i] += float64(i*7919%4001) * 1e-9
	}
	for _, c := range []struct {
		name  string
		pages int64 // from one try to the next
		write func(lb *Logbook) error
	}{
		{"a trial", 1, func(lb *Logbook) error {
			_, err := lb.Add(t.Context(), trial)
			return err
		}},
		{"a trial with waveforms", 1, func(lb *Logbook) error {
			_, err := lb.AddWithWaveforms(t.Context(), trial, append([]waveform.Record{noise}, records...))
			return err
		}},
		{"an import", 5, func(lb *Logbook) error {
			_, err := lb.AddAll(t.Context(), many(200), nil)
			return err
		}},
		{"a merge", 9, func(lb *Logbook) error {
			_, err := lb.Merge(t.Context(), other.Path(), nil)
			return err
		}},
		{"a merge of an older logbook", 5, func(lb *Logbook) error {
			_, err := lb.Merge(t.Context(), older, nil)
			return err
		}},
	} {
		t.Run(c.name, func(t *testing.T) {
			full := 0
			for free := int64(0); ; free += c.pages * 4096 {
				d := smallDisk(t)
				lb := d.open("ringbook.db")
				varied(t, lb)
				want, head := contents(t, lb), mustAudit(t, lb).Head
				d.fill(free)
				err := c.write(lb)
				if err == nil {
					mustAudit(t, lb)
					lb.Close()
					break
				}
				full++
				saysFull(t, err)
				if r := mustAudit(t, lb); r.Head != head || !slices.Equal(contents(t, lb), want) {
					t.Fatalf("with room for %d bytes something was written", free)
				}
				if err := lb.Close(); err != nil {
					t.Errorf("close on a full disk: %v", err)
				}
				d.empty()
				lb = d.open("ringbook.db")
				if r := mustAudit(t, lb); r.Head != head || !slices.Equal(contents(t, lb), want) {
					t.Fatalf("opened anew, it holds something else")
				}
				if err := c.write(lb); err != nil {
					t.Errorf("with room again: %v", err)
				}
				mustAudit(t, lb)
				lb.Close()
			}
			if full == 0 {
				t.Error("the disk was never full: nothing was tested")
			}
			t.Logf("full %d times", full)
		})
	}
}

// TestDiskFullWhileMigrating finds the older logbook as it was, to the byte.
func TestDiskFullWhileMigrating(t *testing.T) {
	for schema := 1; schema <= 3; schema++ {
		old, err := os.ReadFile(version(t, schema))
		if err != nil {
			t.Fatal(err)
		}
		full := 0
		for free := int64(0); ; free += 4096 {
			d := smallDisk(t)
			put(t, d.path("ringbook.db"), old)
			d.fill(free)
			lb, err := Open(t.Context(), d.path("ringbook.db"))
			if err == nil {
				mustAudit(t, lb)
				lb.Close()
				break
			}
			full++
			saysFull(t, err)
			now, err := os.ReadFile(d.path("ringbook.db"))
			if err != nil {
				t.Fatal(err)
			}
			if schema == 3 && !bytes.Equal(now, old) { // an older one may have been moved by one schema, and then be full
				t.Errorf("with room for %d bytes the file was changed", free)
			}
			lb, err = OpenReadOnly(t.Context(), d.path("ringbook.db"))
			if err != nil {
				t.Fatal(err)
			}
			if n := len(collect(t, lb, Scope{IncludeStruck: true})); n == 0 {
				t.Error("no trials on the full disk")
			}
			lb.Close()
			d.empty()
			lb = d.open("ringbook.db")
			if r := mustAudit(t, lb); r.Trials != []int{5, 3, 5}[schema-1] || r.Schema != 4 {
				t.Errorf("%+v", r)
			}
			lb.Close()
		}
		if full == 0 {
			t.Error("the disk was never full: nothing was tested")
		}
		t.Logf("schema %d: full %d times", schema, full)
	}
}

// TestDiskFullWhileBackingUp leaves nothing of a backup that found no room, and the logbook alone.
func TestDiskFullWhileBackingUp(t *testing.T) {
	lb := bench(t, 50)
	full := 0
	for free := int64(0); ; free += 4096 {
		d := smallDisk(t)
		d.fill(free)
		r, err := lb.Backup(t.Context(), d.path("backup.db"))
		if err == nil {
			if !r.Sound() || r.Head != mustAudit(t, lb).Head {
				t.Errorf("%+v", r)
			}
			break
		}
		full++
		if !errors.Is(err, ErrFull) && !errors.Is(err, syscall.ENOSPC) || strings.Contains(err.Error(), "\n") {
			t.Errorf("the error on a full disk: %v", err)
		}
		if !strings.Contains(err.Error(), d.folder) || !strings.Contains(err.Error(), "make room") {
			t.Errorf("it names neither the folder nor the cure: %v", err)
		}
		if left := d.names(); len(left) > 0 {
			t.Errorf("left beside: %v", left)
		}
	}
	if full == 0 {
		t.Error("the disk was never full: nothing was tested")
	}
	mustAudit(t, lb)
	t.Logf("full %d times", full)
}

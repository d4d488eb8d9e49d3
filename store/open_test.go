package store

import (
	"bytes"
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// execOn runs SQL on a file by the bare driver, as another program would.
func execOn(t testing.TB, path string, script string) error {
	t.Helper()
	db, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	_, err = db.ExecContext(t.Context(), script)
	return err
}

func TestOpenRefusesAndLeavesAlone(t *testing.T) {
	whole := func(t *testing.T, path string) {
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := lb.AddAll(t.Context(), many(200), nil); err != nil {
			t.Fatal(err)
		}
		if err := lb.Close(); err != nil {
			t.Fatal(err)
		}
	}
	change := func(t *testing.T, path string, edit func([]byte) []byte) {
		data, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, edit(data), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	for _, c := range []struct {
		name string
		make func(t *testing.T, path string)
		kind error
		says string
	}{
		{"a text file", func(t *testing.T, path string) {
			put(t, path, []byte(strings.Repeat("board,revision,network\n", 400)))
		}, ErrStranger, "not an SQLite file"},
		{"a short text file", func(t *testing.T, path string) { put(t, path, []byte("hello\n")) }, ErrStranger, "not an SQLite file"},
		{"another program's database", func(t *testing.T, path string) {
			if err := execOn(t, path, "CREATE TABLE recipe (id, name)"); err != nil {
				t.Fatal(err)
			}
		}, ErrStranger, "another program's SQLite database"},
		{"another program's marked database in WAL mode", func(t *testing.T, path string) {
			if err := execOn(t, path, "PRAGMA journal_mode=WAL; PRAGMA application_id=0x1234; CREATE TABLE trial (id)"); err != nil {
				t.Fatal(err)
			}
		}, ErrStranger, "application id 0x1234"},
		{"from a newer version", func(t *testing.T, path string) {
			whole(t, path)
			if err := execOn(t, path, "PRAGMA user_version=7"); err != nil {
				t.Fatal(err)
			}
		}, ErrNewer, "use a ringbook that knows schema 7"},
		{"cut short", func(t *testing.T, path string) {
			whole(t, path)
			change(t, path, func(b []byte) []byte { return b[:len(b)/2] })
		}, ErrDamaged, "damaged"},
		{"its schema overwritten", func(t *testing.T, path string) {
			whole(t, path)
			change(t, path, func(b []byte) []byte { copy(b[100:4096], bytes.Repeat([]byte{0xA5}, 3996)); return b })
		}, ErrDamaged, "damaged"},
		{"a folder", func(t *testing.T, path string) {
			if err := os.Mkdir(path, 0o755); err != nil {
				t.Fatal(err)
			}
		}, ErrStranger, "it is a folder"},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := t.TempDir()
			path := filepath.Join(dir, "mine.db")
			c.make(t, path)
			old := time.Date(2020, 1, 2, 3, 4, 5, 0, time.UTC)
			if err := os.Chtimes(path, old, old); err != nil {
				t.Fatal(err)
			}
			before, _ := os.ReadFile(path)
			for _, open := range []func(context.Context, string) (*Logbook, error){Open, OpenReadOnly} {
				lb, err := open(t.Context(), path)
				if err == nil {
					lb.Close()
					t.Fatal("opened")
				}
				if !errors.Is(err, c.kind) || !strings.Contains(err.Error(), c.says) || !strings.Contains(err.Error(), path) {
					t.Errorf("error %q; want kind %q, the path, and %q", err, c.kind, c.says)
				}
				if strings.Contains(err.Error(), "\n") {
					t.Errorf("error of several lines: %q", err)
				}
			}
			after, _ := os.ReadFile(path)
			info, err := os.Stat(path)
			if err != nil {
				t.Fatal(err)
			}
			if !bytes.Equal(before, after) || !info.ModTime().Equal(old) {
				t.Errorf("the file was touched: %d bytes before, %d after, modified %v", len(before), len(after), info.ModTime())
			}
			if names, _ := filepath.Glob(filepath.Join(dir, "*")); len(names) != 1 {
				t.Errorf("left beside it: %v", names)
			}
		})
	}
}

// A file whose header could not be read while another program wrote is looked at again once it is open.
func TestStrangerSeenOnceOpen(t *testing.T) {
	path := filepath.Join(t.TempDir(), "mine.db")
	if err := execOn(t, path, "PRAGMA application_id=0x1234; PRAGMA user_version=2; CREATE TABLE trial (id)"); err != nil {
		t.Fatal(err)
	}
	lb, err := openToRead(t.Context(), path, "mode=rw")
	if err == nil {
		lb.Close()
	}
	if !errors.Is(err, ErrStranger) || !strings.Contains(err.Error(), "0x1234") {
		t.Errorf("another program's file, opened to read: %v", err)
	}
}

func put(t *testing.T, path string, data []byte) {
	t.Helper()
	if err := os.WriteFile(path, data, 0o644); err != nil {
		t.Fatal(err)
	}
}

func TestOpenWhereThereIsNothing(t *testing.T) {
	dir := t.TempDir()
	if _, err := OpenReadOnly(t.Context(), filepath.Join(dir, "a.db")); !errors.Is(err, ErrMissing) {
		t.Errorf("read-only: %v", err)
	}
	if _, err := Open(t.Context(), filepath.Join(dir, "no", "a.db")); !errors.Is(err, ErrMissing) || !strings.Contains(err.Error(), "folder") {
		t.Errorf("no folder: %v", err)
	}
	if _, err := Open(t.Context(), ""); !errors.Is(err, ErrMissing) {
		t.Errorf("no name: %v", err)
	}
	empty := filepath.Join(dir, "an empty file, größe 0 % ?x=1#.db")
	if err := os.WriteFile(empty, nil, 0o644); err != nil {
		t.Fatal(err)
	}
	lb, err := Open(t.Context(), empty)
	if err != nil {
		t.Fatal(err)
	}
	mustAdd(t, lb, example())
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	if names, _ := os.ReadDir(dir); len(names) != 1 || names[0].Name() != filepath.Base(empty) {
		t.Errorf("files %v; want the logbook alone", names)
	}
}

func TestSettingsOfEveryConnection(t *testing.T) {
	lb := openTemp(t)
	var held []*sql.Conn
	for range 3 {
		conn, err := lb.db.Conn(t.Context())
		if err != nil {
			t.Fatal(err)
		}
		held = append(held, conn)
		for pragma, want := range map[string]string{
			"journal_mode": "wal", "synchronous": "2", "foreign_keys": "1", "busy_timeout": "10000", "recursive_triggers": "1",
			"application_id": fmt.Sprint(applicationID), "user_version": "4",
		} {
			var got string
			if err := conn.QueryRowContext(t.Context(), "PRAGMA "+pragma).Scan(&got); err != nil || got != want {
				t.Errorf("%s = %s, %v; want %s", pragma, got, err, want)
			}
		}
	}
	for _, conn := range held {
		conn.Close()
	}
}

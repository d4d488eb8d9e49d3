package recipes

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
)

// Content is a file and what is to be in it.
type Content struct {
	Path string
	Text []byte
}

func (c Content) write(w io.Writer) error {
	_, err := w.Write(c.Text)
	return err
}

// WriteAll writes all files, in one folder, or none: each under another name with .part in it, and when all are on the disk
// each is given its own, the last one last. On an error everything is as it was. A program that is killed may leave files with
// .part or .before in their names, and no file half written. Errors are ErrExists where a file exists and replace is false.
func WriteAll(files []Content, replace bool) error {
	var b batch
	defer func() { b.discard() }()
	for _, f := range files {
		if err := b.stage(f.Path, f.write, replace); err != nil {
			return fmt.Errorf("write %q: %w; nothing was written", f.Path, err)
		}
	}
	if err := b.commit(replace); err != nil {
		return fmt.Errorf("write %q: %w; nothing was written", files[len(files)-1].Path, err)
	}
	return nil
}

// WriteFile writes one file as WriteAll does, with what write puts into it, for a file that memory should not hold. Errors are
// also those of write.
func WriteFile(path string, replace bool, write func(io.Writer) error) error {
	var b batch
	defer func() { b.discard() }()
	err := b.stage(path, write, replace)
	if err == nil {
		err = b.commit(replace)
	}
	if err != nil {
		return fmt.Errorf("write %q: %w; nothing was written", path, err)
	}
	return nil
}

// batch is files that shall all be written or none.
type batch []*staged

// staged is a file that is on the disk under another name.
type staged struct {
	path   string // what it shall be called
	part   string // what it is called until then; "" once that name is gone
	before string // what keeps the file that was called so; "" for nothing
	undone func() // takes its name from it again; nil where that cannot be
}

// stage writes a file under another name in the same folder, and waits until it is on the disk.
func (b *batch) stage(path string, write func(io.Writer) error, replace bool) (err error) {
	if err := free(path, replace); err != nil {
		return err
	}
	mode := fs.FileMode(0o666) // less what the user's mask takes
	if info, err := os.Stat(path); err == nil {
		mode = info.Mode().Perm()
	}
	part := beside(path, "part")
	f, err := os.OpenFile(part, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
	if err != nil {
		return cause(err)
	}
	*b = append(*b, &staged{path: path, part: part})
	err = write(f)
	if err == nil {
		err = f.Sync()
	}
	if e := f.Close(); err == nil {
		err = e
	}
	return cause(err)
}

// commit gives each file its name, in the order they were staged. On an error it puts back what was there.
func (b batch) commit(replace bool) (err error) {
	defer func() {
		if err != nil {
			for _, s := range b { // what cannot be put back stays: err is what to tell
				if s.undone != nil {
					s.undone()
				}
			}
		}
	}()
	for _, s := range b {
		if err := s.place(replace, len(b) > 1); err != nil {
			return cause(err)
		}
	}
	if len(b) > 0 {
		syncFolder(filepath.Dir(b[0].path))
	}
	return nil
}

// place gives a file its name. keep says that the file which had the name is to be kept until discard.
func (s *staged) place(replace, keep bool) error {
	remove := func() { os.Remove(s.path) }
	if !replace {
		// A link, other than a new name, never takes another file's place.
		if os.Link(s.part, s.path) == nil {
			s.undone = remove
			return nil
		}
		if err := free(s.path, false); err != nil { // another program was faster
			return err
		}
		// This file system has no links.
	}
	undone := remove
	if replace && keep {
		before := beside(s.path, "before")
		switch err := os.Link(s.path, before); {
		case err == nil:
			s.before = before
			undone = func() { os.Rename(before, s.path) }
		case !errors.Is(err, fs.ErrNotExist):
			undone = nil
		}
	}
	if err := os.Rename(s.part, s.path); err != nil {
		return err
	}
	s.part, s.undone = "", undone
	return nil
}

// discard removes what is no longer needed.
func (b batch) discard() {
	for _, s := range b {
		for _, name := range []string{s.part, s.before} {
			if name != "" {
				os.Remove(name) // it is in nobody's way
			}
		}
	}
}

// beside is a name in the same folder that no file has.
func beside(path, what string) string { return fmt.Sprintf("%s.%s-%08x", path, what, rand.Uint32()) }

// syncFolder waits until the names in a folder are on the disk, where the system can.
func syncFolder(path string) {
	if d, err := os.Open(path); err == nil {
		_ = d.Sync() // not every system syncs a folder
		d.Close()
	}
}

package main

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"os"
	"strings"
	"sync"

	"ringbook/acquire"
)

// asker puts questions on stderr and gives the lines that answer them: from a file, or from whoever is at stdin.
type asker struct {
	app  *app
	path string // of the file; "" for stdin
	file *os.File

	mu    sync.Mutex
	lines []string // typed and not asked for yet
	end   error    // after them; nil: more may come
	news  chan struct{}

	script *bufio.Scanner // of the file
	number int            // of its line read last
}

func (a *app) newAsker(path string) (*asker, error) {
	k := &asker{app: a, path: path, news: make(chan struct{}, 1)}
	if path == "" {
		go k.listen(a.stdin)
		return k, nil
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("answers: %w", err)
	}
	k.file, k.script = f, bufio.NewScanner(f)
	return k, nil
}

func (k *asker) close() {
	if k.file != nil {
		k.file.Close()
	}
}

// listen takes lines as they are typed. It ends with stdin, or with the program.
func (k *asker) listen(stdin io.Reader) {
	typed := bufio.NewScanner(stdin)
	for typed.Scan() {
		k.hear(typed.Text(), nil)
	}
	end := typed.Err()
	if end == nil {
		end = io.EOF
	}
	k.hear("", end)
}

func (k *asker) hear(line string, end error) {
	k.mu.Lock()
	if k.end = end; end == nil {
		k.lines = append(k.lines, line)
	}
	k.mu.Unlock()
	select {
	case k.news <- struct{}{}:
	default:
	}
}

// ask shows a question and waits for its answer. What was typed before it stood there answers nothing.
func (k *asker) ask(ctx context.Context, show *seriesView, q acquire.Question) (string, error) {
	if k.script != nil {
		return k.read(show, q)
	}
	k.mu.Lock()
	early := len(k.lines)
	k.lines = nil
	k.mu.Unlock()
	if early > 0 && q.Again == "" {
		show.remark("What was typed before the question is not taken as its answer.")
	}
	show.question(q)
	for {
		k.mu.Lock()
		line, any, end := "", len(k.lines) > 0, k.end
		if any {
			line, k.lines = k.lines[0], k.lines[1:]
		}
		k.mu.Unlock()
		switch {
		case any:
			return line, nil
		case end != nil:
			show.answer("")
			return "", end
		}
		select {
		case <-ctx.Done():
			show.answer("")
			return "", ctx.Err()
		case <-k.news:
		}
	}
}

// read is ask from the file. One answer that is not understood makes all behind it doubtful, so that it is an error.
func (k *asker) read(show *seriesView, q acquire.Question) (string, error) {
	if q.Again != "" {
		return "", fmt.Errorf("answers %s, line %d: %s", k.path, k.number, q.Again)
	}
	show.question(q)
	if !k.script.Scan() {
		show.answer("")
		if err := k.script.Err(); err != nil {
			return "", fmt.Errorf("answers %s: %w", k.path, err)
		}
		return "", io.EOF
	}
	k.number++
	line := strings.TrimSuffix(k.script.Text(), "\r")
	show.answer(line)
	return line, nil
}

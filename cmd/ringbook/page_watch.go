package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"net"
	"net/netip"
	"os"
	"strconv"
	"time"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/store"
)

const (
	watchEvery = 200 * time.Millisecond // how often the logbook is asked whether it changed
	watchAgain = time.Second            // until a logbook that could not be read is opened again
)

// watchPage serves a page on the loopback interface until ctx ends, and weaves it anew whenever the logbook changes.
func (a *app) watchPage(ctx context.Context, w weaving, listen string) error {
	if _, err := w.flags.read(); err != nil {
		return err
	}
	l, err := listenLoopback(ctx, listen)
	if err != nil {
		return err
	}
	site := newSite(l.Addr().String())
	if err := site.show(w.recipe.Failed(store.Scope{}, errors.New("the page is being woven for the first time"))); err != nil {
		return errors.Join(err, l.Close())
	}
	ctx, stop := context.WithCancel(ctx)
	defer stop()
	woven := make(chan error, 1)
	go func() {
		defer stop()
		woven <- a.follow(ctx, w, site)
	}()
	url := "http://" + l.Addr().String() + "/"
	if a.json {
		err = a.printJSON(map[string]string{"url": url, "recipe": w.recipe.Name})
	} else {
		err = a.say("The page is at %s", url)
	}
	if err == nil {
		a.progress("It is woven anew when a trial is logged; Ctrl-C ends it.")
		err = site.serve(ctx, l)
	} else {
		err = errors.Join(err, l.Close())
	}
	stop()
	return errors.Join(err, <-woven)
}

// listenLoopback listens at an address of this computer that no other one can reach.
func listenLoopback(ctx context.Context, address string) (net.Listener, error) {
	host, port, err := net.SplitHostPort(address)
	if err == nil {
		_, err = strconv.ParseUint(port, 10, 16)
	}
	if err != nil {
		return nil, usagef("--listen %q: write an address of this computer and a port, such as 127.0.0.1:8023", address)
	}
	refuse := usagef("--listen %q: the page is served to this computer alone; give 127.0.0.1, localhost or [::1] and a port", address)
	if ip, err := netip.ParseAddr(host); host != "localhost" && (err != nil || !ip.Unmap().IsLoopback()) {
		return nil, refuse
	}
	var lc net.ListenConfig
	l, err := lc.Listen(ctx, "tcp", address)
	if err != nil {
		var sys *os.SyscallError
		if errors.As(err, &sys) {
			err = sys.Err
		}
		return nil, fmt.Errorf("page: serving at %s: %w; give another port, or 0 for a free one", address, err)
	}
	if at, ok := l.Addr().(*net.TCPAddr); !ok || !at.IP.IsLoopback() { // a hosts file can say anything of localhost
		return nil, errors.Join(refuse, l.Close())
	}
	return l, nil
}

// follow weaves the page, and weaves it again whenever the logbook changes, until ctx ends. What goes wrong is on the page,
// and does not end it: the logbook may come, or come back.
func (a *app) follow(ctx context.Context, w weaving, s *site) error {
	for {
		err := a.followOpen(ctx, w, s)
		if ctx.Err() != nil {
			return nil
		}
		if err := s.show(w.recipe.Failed(store.Scope{}, err)); err != nil {
			return err
		}
		select {
		case <-ctx.Done():
			return nil
		case <-time.After(watchAgain):
		}
	}
}

// followOpen follows the logbook while it can be read.
func (a *app) followOpen(ctx context.Context, w weaving, s *site) (err error) {
	scope, err := w.flags.read()
	if err != nil {
		return err
	}
	lb, err := a.read(ctx)
	if err != nil {
		return err
	}
	defer closing(lb, &err)
	m, err := lb.Monitor(ctx)
	if err != nil {
		return err
	}
	defer m.Close()
	for {
		began := time.Now()
		woven, failed := w.recipe.Page(ctx, recipes.Source{Logbook: lb, Scope: scope, Limits: w.limits, OnHand: w.onHand})
		if ctx.Err() != nil {
			return ctx.Err()
		}
		if woven == nil {
			woven = &recipes.Woven{Page: w.recipe.Failed(scope, failed)}
		}
		if err := s.show(woven.Page); err != nil {
			return err
		}
		// A page that takes long to weave leaves the computer half of its time for other work.
		pause := max(watchEvery, time.Since(began))
		for changed := false; !changed; pause = watchEvery {
			select {
			case <-ctx.Done():
				return ctx.Err()
			case <-time.After(pause):
			}
			if changed, err = m.Changed(ctx); err != nil {
				return err
			}
		}
	}
}

// show puts a page in the place of the one before.
func (s *site) show(p *page.Page) error {
	var html bytes.Buffer
	if err := p.HTML(&html); err != nil {
		// What makes a page impossible to write, such as a row too short, is shown like any other error.
		html.Reset()
		instead := page.New("Page")
		_ = instead.Run(func() error { return err }) // it gives err back
		if err := instead.HTML(&html); err != nil {
			return err
		}
	}
	return s.put(html.Bytes())
}

package main

import (
	"context"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"

	"github.com/chromedp/cdproto/accessibility"
	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
)

// tab is one page in the browser, and what went on in it.
type tab struct {
	testing.TB
	ctx   context.Context
	probe string // testdata/pages_browser.js

	mu       sync.Mutex
	said     []string // on the console: errors, warnings, exceptions, what a policy refused
	requests []string
}

// open opens an address in a tab of its own.
func open(t *testing.T, browser context.Context, address string) *tab {
	t.Helper()
	probe, err := os.ReadFile(filepath.Join("testdata", "pages_browser.js"))
	if err != nil {
		t.Fatal(err)
	}
	ctx, shut := chromedp.NewContext(browser)
	t.Cleanup(shut)
	x := &tab{TB: t, ctx: ctx, probe: string(probe)}
	if err := chromedp.Listen(ctx, x.note); err != nil {
		t.Fatal(err)
	}
	x.do(command(network.Enable, network.EnableParams{}), command(log.Enable, cdp.Empty{}), chromedp.Navigate(address))
	return x
}

// note keeps an event of the page.
func (x *tab) note(event any) {
	x.mu.Lock()
	defer x.mu.Unlock()
	switch e := event.(type) {
	case *runtime.EventConsoleAPICalled:
		x.said = append(x.said, fmt.Sprintf("console.%s: %s", e.Type, values(e.Args)))
	case *runtime.EventExceptionThrown:
		x.said = append(x.said, fmt.Sprintf("exception: %s %v", e.ExceptionDetails.Text, e.ExceptionDetails.Exception))
	case *log.EventEntryAdded:
		x.said = append(x.said, fmt.Sprintf("%s: %s %s", e.Entry.Level, e.Entry.Text, e.Entry.URL))
	case *network.EventRequestWillBeSent:
		x.requests = append(x.requests, e.Request.URL)
	}
}

func values(args []*runtime.RemoteObject) string {
	var b strings.Builder
	for _, a := range args {
		fmt.Fprintf(&b, "%s%s ", a.Value, a.Description)
	}
	return b.String()
}

// heard gives what was said on the console and which requests were made, since it was last asked.
func (x *tab) heard() (said, requests []string) {
	x.mu.Lock()
	defer x.mu.Unlock()
	said, requests, x.said, x.requests = x.said, x.requests, nil, nil
	return said, requests
}

func (x *tab) do(steps ...chromedp.Action[chromedp.Void]) {
	x.Helper()
	if err := chromedp.Do(x.ctx, steps...); err != nil {
		x.Fatal(err)
	}
}

// command is a command of the protocol whose answer is of no use here.
func command[P, R any](c cdp.Command[P, R], params P) chromedp.Action[chromedp.Void] {
	return chromedp.Func(func(ctx context.Context, t *chromedp.Target) error {
		_, err := cdp.Call(ctx, t, c, params)
		return err
	})
}

// size makes the window so wide, and as high as most are.
func (x *tab) size(width int64) {
	x.Helper()
	x.do(command(emulation.SetDeviceMetricsOverride, emulation.SetDeviceMetricsOverrideParams{Width: width, Height: 800, DeviceScaleFactor: 1}))
}

// look has the page seen as a reader wants it: scheme is light or dark, medium screen or print.
func (x *tab) look(medium, scheme string) {
	x.Helper()
	x.do(command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Media: medium,
		Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: scheme}}}))
}

// eval gives the value of an expression in the page.
func eval[T any](x *tab, expression string) T {
	x.Helper()
	v, err := chromedp.Run(x.ctx, chromedp.Evaluate[T](expression))
	if err != nil {
		x.Fatalf("%.80s: %v", expression, err)
	}
	return v
}

// finds reports the faults that a function of the probe finds.
func (x *tab) finds(function, where string) {
	x.Helper()
	for _, fault := range eval[[]string](x, x.probe+"."+function+"()") {
		x.Errorf("%s: %s", where, fault)
	}
}

// plotsAreNamed looks at the plots as a screen reader does: each is an image with a text in its place.
func (x *tab) plotsAreNamed() {
	x.Helper()
	tree, err := chromedp.Run(x.ctx, func(ctx context.Context, t *chromedp.Target) (accessibility.GetFullAXTreeResult, error) {
		return cdp.Call(ctx, t, accessibility.GetFullAXTree, accessibility.GetFullAXTreeParams{})
	})
	if err != nil {
		x.Fatal(err)
	}
	images := 0
	for _, n := range tree.Nodes {
		if n.Role == nil || n.Ignored {
			continue
		}
		var role, name string
		if err := json.Unmarshal(n.Role.Value, &role); err != nil {
			x.Fatal(err)
		}
		if role != "image" && role != "img" {
			continue
		}
		images++
		if n.Name != nil {
			if err := json.Unmarshal(n.Name.Value, &name); err != nil {
				x.Fatal(err)
			}
		}
		if len(name) < 80 || !strings.Contains(name, " to ") {
			x.Errorf("a plot's text is %q, which does not say what it shows", name)
		}
	}
	if plots := eval[int](x, "document.querySelectorAll('svg').length"); images != plots {
		x.Errorf("%d images for a screen reader, %d plots", images, plots)
	}
}

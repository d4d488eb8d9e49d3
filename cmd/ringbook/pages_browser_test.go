package main

import (
	"context"
	"encoding/json"
	"fmt"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"ringbook/recipes"

	"github.com/chromedp/cdproto/accessibility"
	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
)

// needs skips a test where a program is not installed, unless RINGBOOK_CHECKS is "all": then it fails, so that the gate cannot
// pass without it. It gives the program's path.
func needs(t *testing.T, program, debian string) string {
	t.Helper()
	path, err := exec.LookPath(program)
	if err == nil {
		return path
	}
	if os.Getenv("RINGBOOK_CHECKS") == "all" {
		t.Fatalf("this check needs %s: install Debian's %s (%v)", program, debian, err)
	}
	t.Skipf("%s is not installed: Debian's %s has it", program, debian)
	return ""
}

// browser starts Chromium without a window, with no way to the net. Another one, of the same protocol, may be named in
// RINGBOOK_BROWSER. Its sandbox is left out for root alone, who cannot have one; chromedp sees to that.
func browser(t *testing.T) context.Context {
	t.Helper()
	program := os.Getenv("RINGBOOK_BROWSER")
	if program == "" {
		program = "chromium"
	}
	options := append(chromedp.DefaultExecAllocatorOptions[:len(chromedp.DefaultExecAllocatorOptions):len(chromedp.DefaultExecAllocatorOptions)],
		chromedp.ExecPath(needs(t, program, "chromium")),
		chromedp.Flag("host-resolver-rules", "MAP * ~NOTFOUND, EXCLUDE 127.0.0.1"),
		chromedp.Flag("disable-gpu", true),
		chromedp.Flag("disable-component-update", true))
	ctx, stop := context.WithTimeout(context.Background(), time.Minute)
	t.Cleanup(stop)
	ctx, stop = chromedp.NewExecAllocator(ctx, options...)
	t.Cleanup(stop)
	ctx, stop = chromedp.NewContext(ctx)
	t.Cleanup(stop)
	if err := chromedp.Do(ctx); err != nil {
		t.Fatalf("start %s: %v", program, err)
	}
	return ctx
}

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

// fileURL is the address of a file on this computer.
func fileURL(path string) string {
	return (&url.URL{Scheme: "file", Path: filepath.ToSlash(path)}).String()
}

// pageFile is a page as it was written to a file.
type pageFile struct{ name, path string }

// writePage writes a woven page as `ringbook page -o` does.
func writePage(t *testing.T, dir, name string, woven *recipes.Woven) pageFile {
	t.Helper()
	path := filepath.Join(dir, name+".html")
	file, err := recipes.NewFile(path, false)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := file.Write(woven.Page); err != nil {
		t.Fatal(err)
	}
	return pageFile{name, path}
}

// demoFiles are the demonstration's pages, and that of a capture in its logbook.
func demoFiles(t *testing.T) []pageFile {
	t.Helper()
	dir := t.TempDir()
	lb := demoLogbook(t)
	var files []pageFile
	for _, r := range recipes.All() {
		files = append(files, writePage(t, dir, r.Name, demoPage(t, lb, r)))
	}
	return files
}

// TestPagesInBrowser opens the pages as a reader does, on a telephone and on a desk, by day and by night.
func TestPagesInBrowser(t *testing.T) {
	chromium := browser(t)
	for _, f := range slices.Concat(demoFiles(t), captureFiles(t), hostileFiles(t)) {
		t.Run(f.name, func(t *testing.T) {
			address := fileURL(f.path)
			x := open(t, chromium, address)
			x.finds("structure", "the page")
			if strings.HasPrefix(f.name, "hostile") {
				x.showsHostile(f.name)
			}
			for _, folded := range []bool{true, false} {
				if !folded && eval[int](x, x.probe+".open()") == 0 {
					t.Error("the page has no code")
				}
				for _, width := range []int64{360, 1280} {
					x.size(width)
					x.finds("overflow", fmt.Sprintf("at %d px, code folded %v", width, folded))
				}
				for _, scheme := range []string{"light", "dark"} {
					x.look("screen", scheme)
					x.finds("contrast", scheme)
				}
			}
			if dark := eval[string](x, "getComputedStyle(document.body).backgroundColor"); dark == "rgb(255, 255, 255)" {
				t.Error("the page is white in the dark")
			}
			x.plotsAreNamed()
			if pwned := eval[bool](x, "'pwned' in window"); pwned {
				t.Error("a text of the logbook was run")
			}
			said, requests := x.heard()
			for _, s := range said {
				t.Error(s)
			}
			if len(requests) != 1 || requests[0] != address {
				t.Errorf("the page asks for %q", requests)
			}
		})
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

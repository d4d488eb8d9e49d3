package main

import (
	"context"
	"fmt"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"ringbook/recipes"

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
	ctx, stop := context.WithTimeout(context.Background(), 5*time.Minute) // on a busy machine; it takes seconds
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

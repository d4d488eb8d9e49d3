package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"io"
	"os"
	"os/exec"
	"path"
	"slices"
	"strings"
	"testing"
)

// rooms are the packages that stand on one another, from the top of the house down. A package belongs to the
// longest entry that is a prefix of its path. It may import what stands below its own room, and within its room
// what the room's own list allows.
var rooms = []struct {
	name string
	may  []string // rooms it may import
}{
	{"cmd/ringbook", []string{"recipes", "recipes/page", "store", "acquire", "acquire/scpi", "acquire/wire", "acquire/simbench", "acquire/acquiretest", "snubber", "snubber/waveform", "snubber/leastsq", "snubber/preferred", "snubber/quantity"}},
	{"recipes", []string{"recipes/page", "store", "snubber", "snubber/waveform", "snubber/leastsq", "snubber/preferred", "snubber/quantity"}},
	{"recipes/page", []string{"snubber", "snubber/quantity"}},
	{"store", []string{"snubber", "snubber/waveform", "snubber/quantity"}},
	{"acquire", []string{"acquire/scpi", "acquire/wire", "snubber", "snubber/waveform", "snubber/quantity"}},
	{"acquire/scpi", nil},
	{"acquire/wire", nil},
	{"acquire/acquiretest", []string{"acquire/scpi", "acquire/wire"}},
	// The independent witness: it never sees the response it is there to check.
	{"acquire/simbench", []string{"snubber/quantity"}},
	{"snubber", []string{"snubber/leastsq", "snubber/preferred", "snubber/quantity", "snubber/waveform"}},
	{"snubber/waveform", []string{"snubber/leastsq", "snubber/quantity"}},
	{"snubber/leastsq", nil},
	{"snubber/preferred", []string{"snubber/quantity"}},
	{"snubber/quantity", nil},
	{"snubber/scipytest", nil}, // for tests only: see TestHouse
}

const module = "ringbook/"

func room(pkg string) string {
	best := ""
	for _, r := range rooms {
		if (pkg == r.name || strings.HasPrefix(pkg, r.name+"/")) && len(r.name) > len(best) {
			best = r.name
		}
	}
	return best
}

// wrongWay says what is wrong with package from importing package to, both within the module; "" when nothing is.
func wrongWay(from, to string) string {
	a, b := room(from), room(to)
	switch {
	case a == "":
		return from + " stands in no room of the house"
	case b == "":
		return to + " stands in no room of the house"
	case a == b:
		return ""
	}
	for _, r := range rooms {
		if r.name == a && !slices.Contains(r.may, b) {
			return from + " imports " + to + ": room " + a + " may not know room " + b
		}
	}
	return ""
}

// TestHouse fails when an import runs the wrong way, or a folder stands where none belongs.
func TestHouse(t *testing.T) {
	cmd := exec.Command("go", "list", "-json=ImportPath,Imports", "./...")
	cmd.Dir = "../.."
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("go list: %v\n%s", err, stderr.Bytes())
	}
	dec := json.NewDecoder(bytes.NewReader(out))
	packages := 0
	for {
		var p struct {
			ImportPath string
			Imports    []string
		}
		if err := dec.Decode(&p); errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		packages++
		from := strings.TrimPrefix(p.ImportPath, module)
		if room(from) == "" {
			t.Errorf("%s stands in no room of the house", from)
		}
		for _, to := range p.Imports {
			if !strings.HasPrefix(to, module) {
				if from != "acquire/simbench" && to == "github.com/creack/pty" || to == "testing" && !strings.HasSuffix(path.Base(from), "test") {
					t.Errorf("%s imports %s outside its tests", from, to)
				}
				continue
			}
			if w := wrongWay(from, strings.TrimPrefix(to, module)); w != "" {
				t.Error(w)
			}
		}
	}
	if packages < 10 {
		t.Errorf("go list names only %d packages", packages)
	}
	top, err := os.ReadDir("../..")
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range top {
		if e.IsDir() && !strings.HasPrefix(e.Name(), ".") && !slices.Contains([]string{"snubber", "acquire", "store", "cmd", "recipes", "testdata"}, e.Name()) {
			t.Errorf("folder %s stands at the top of the house", e.Name())
		}
	}
}

// The check itself: each forbidden direction is seen.
func TestWrongWay(t *testing.T) {
	for _, c := range [][2]string{
		{"snubber", "store"}, {"snubber", "acquire"}, {"store", "acquire"}, {"acquire", "store"},
		{"store", "recipes"}, {"acquire/scpi", "acquire"}, {"acquire/simbench", "snubber"},
		{"acquire/simbench/device", "snubber/leastsq"}, {"snubber/quantity", "snubber"}, {"recipes/page", "store"},
		{"recipes", "cmd/ringbook"}, {"recipes", "acquire"}, {"util", "snubber"}, {"snubber", "snubber/scipytest"},
	} {
		if wrongWay(c[0], c[1]) == "" {
			t.Errorf("%s importing %s passes", c[0], c[1])
		}
	}
	if w := wrongWay("store", "snubber"); w != "" {
		t.Error(w)
	}
}

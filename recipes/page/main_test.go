package page_test

import (
	"os"
	"os/exec"
	"testing"

	"ringbook/recipes/page"
)

// TestMain lets the test binary print the page itself, for the test that needs a process with another locale.
func TestMain(m *testing.M) {
	if os.Getenv("PAGE_TEST_PRINT") != "" {
		if err := trialsPage().Text(os.Stdout, page.TextOptions{}); err != nil {
			os.Exit(1)
		}
		return
	}
	os.Exit(m.Run())
}

func runSelf(t *testing.T, env string) string {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), os.Args[0])
	cmd.Env = append(os.Environ(), "PAGE_TEST_PRINT=1", env)
	out, err := cmd.Output()
	if err != nil {
		t.Fatal(err)
	}
	return string(out)
}

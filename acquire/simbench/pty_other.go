//go:build !unix

package simbench

import (
	"errors"
	"fmt"
)

// ServePTY needs pseudo-terminals, which only Unix has.
func (b *Bench) ServePTY(name string) (path string, err error) {
	return "", fmt.Errorf("serve the %s on a pseudo-terminal: %w; use its TCP address", name, errors.ErrUnsupported)
}

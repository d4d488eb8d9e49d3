//go:build !(linux || darwin || freebsd || openbsd)

package scpi

// pending does not know: the link has to be listened to.
func pending(any) (some, known bool) { return false, false }

package device

import (
	"fmt"
	"strings"
)

// header is a command's header as the standard writes it, compiled: FIXTure:FIT, [SOURce]:VOLTage?.
type header struct {
	nodes []node
	query bool
}

// node is one mnemonic of a header.
type node struct {
	short, long string // upper case
	optional    bool
}

// compile reads a header's notation: capitals are the short form, brackets hold an optional node.
func compile(notation string) (header, error) {
	var h header
	rest, query := strings.CutSuffix(notation, "?")
	h.query = query
	for rest != "" {
		n := node{}
		body := rest
		if strings.HasPrefix(rest, "[") {
			end := strings.IndexByte(rest, ']')
			if end < 0 {
				return header{}, fmt.Errorf("header %q: a bracket stays open", notation)
			}
			n.optional = true
			body, rest = rest[1:end], rest[end+1:]
		} else if i := strings.IndexAny(rest[1:], ":["); i >= 0 {
			body, rest = rest[:i+1], rest[i+1:]
		} else {
			rest = ""
		}
		body = strings.TrimPrefix(body, ":")
		n.long = strings.ToUpper(body)
		n.short = strings.TrimRight(body, "abcdefghijklmnopqrstuvwxyz")
		if n.short == "" || n.short != strings.ToUpper(n.short) || !strings.HasPrefix(n.long, n.short) {
			return header{}, fmt.Errorf("header %q: the node %q has no short form in capitals", notation, body)
		}
		h.nodes = append(h.nodes, n)
	}
	if len(h.nodes) == 0 {
		return header{}, fmt.Errorf("header %q: it is empty", notation)
	}
	return h, nil
}

// match says whether a header as written means this one; badSuffix when it would but for a numeric
// suffix other than 1.
func (h header) match(nodes []string) (ok, badSuffix bool) { return matchNodes(h.nodes, nodes) }

func matchNodes(want []node, have []string) (ok, badSuffix bool) {
	if len(want) == 0 {
		return len(have) == 0, false
	}
	if len(have) > 0 {
		if is, bad := want[0].is(have[0]); is {
			if ok, badLater := matchNodes(want[1:], have[1:]); ok {
				return true, bad || badLater
			}
		}
	}
	if want[0].optional {
		return matchNodes(want[1:], have)
	}
	return false, false
}

// is compares one node. A missing numeric suffix means 1 (SCPI-1999 volume 1, 6.2.5.2).
func (n node) is(word string) (ok, badSuffix bool) {
	word = strings.ToUpper(word)
	if word == n.short || word == n.long {
		return true, false
	}
	stem := strings.TrimRight(word, "0123456789")
	if stem == n.short || stem == n.long {
		return true, word[len(stem):] != "1"
	}
	return false, false
}

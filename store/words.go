package store

import (
	"fmt"
	"strings"
	"unicode"
)

// Bounds of what is searched for.
const (
	maxWords      = 50
	maxWordsBytes = 10_000
)

// parseWords reads what a person searches for: words that must all be there, in any order; "words in quotation marks" that
// stand together; and word*, of which only the beginning is given. A mark left open reaches to the end. Whatever else is in
// a word separates words that stand together: winch-drive finds winch drive and the other way round.
//
// Each comes back as a phrase of SQLite's FTS5 (https://sqlite.org/fts5.html, 3.1 and 3.2), which is safe to search for.
func parseWords(text string) ([]string, error) {
	if len(text) > maxWordsBytes {
		return nil, fmt.Errorf("the words to search for have %d bytes; give at most %d", len(text), maxWordsBytes)
	}
	var phrases []string
	rest := strings.ToValidUTF8(text, " ")
	for {
		rest = strings.TrimLeftFunc(rest, gap)
		if rest == "" {
			return phrases, nil
		}
		var word string
		if quoted, ok := strings.CutPrefix(rest, `"`); ok {
			word, rest, _ = strings.Cut(quoted, `"`)
			if after, ok := strings.CutPrefix(rest, "*"); ok {
				word, rest = word+"*", after
			}
		} else {
			end := strings.IndexFunc(rest, func(r rune) bool { return gap(r) || r == '"' })
			if end < 0 {
				end = len(rest)
			}
			word, rest = rest[:end], rest[end:]
		}
		if !strings.ContainsFunc(word, lettered) {
			if strings.TrimFunc(word, gap) == "" {
				continue // an empty pair of marks
			}
			return nil, fmt.Errorf("%s has no letter or digit to search for; leave it out", quote(word))
		}
		if len(phrases) == maxWords {
			return nil, fmt.Errorf("there are more than %d words to search for; give fewer", maxWords)
		}
		phrase := `"` + strings.Map(plainRune, strings.TrimSuffix(word, "*")) + `"`
		if strings.HasSuffix(word, "*") {
			phrase += " *"
		}
		phrases = append(phrases, phrase)
	}
}

// gap is what separates words; a control character too, NUL among them, which no logged text has.
func gap(r rune) bool { return unicode.IsSpace(r) || unicode.IsControl(r) }

// lettered is what words are made of for FTS5's tokenizer unicode61.
func lettered(r rune) bool {
	return unicode.IsLetter(r) || unicode.IsNumber(r) || unicode.Is(unicode.Co, r)
}

func plainRune(r rune) rune {
	if gap(r) || r == '"' {
		return ' '
	}
	return r
}

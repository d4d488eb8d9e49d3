package page

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// plain makes text of unknown origin safe to show in any output. Line breaks and tabs become spaces.
// Control characters (so also terminal escapes, ECMA-48), the marks that turn the direction of writing
// (Unicode Standard Annex 9) and other invisible format characters become visible: \x1b, \u202e. The two
// joiners stay, since some scripts cannot be written without them. Bytes that are not UTF-8 become U+FFFD.
func plain(s string) string {
	clean := true
	for i := 0; i < len(s); i++ {
		if s[i] < ' ' || s[i] > '~' {
			clean = false
			break
		}
	}
	if clean {
		return s
	}
	var b strings.Builder
	s = strings.ReplaceAll(s, "\r\n", "\n")
	for _, r := range s {
		switch {
		case r == '\n', r == '\r', r == '\t', r == '\v', r == '\f', r == '\u0085', r == '\u2028', r == '\u2029':
			b.WriteByte(' ')
		case r == '\u200c', r == '\u200d':
			b.WriteRune(r)
		case unicode.In(r, unicode.Cc, unicode.Cf, unicode.Other_Default_Ignorable_Code_Point):
			b.WriteString(visible(r))
		case !utf8.ValidRune(r), r&0xFFFE == 0xFFFE:
			b.WriteRune(utf8.RuneError)
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

func visible(r rune) string {
	switch {
	case r < 0x100:
		return fmt.Sprintf(`\x%02x`, r)
	case r < 0x10000:
		return fmt.Sprintf(`\u%04x`, r)
	}
	return fmt.Sprintf(`\U%08x`, r)
}

// escapeMarkdown writes text so that CommonMark and GitHub's table and link extensions show it as it is.
// A backslash before ASCII punctuation is that character (CommonMark 0.31.2, 2.4). atStart says that the
// text begins a block, where "1." and "-" would begin a list.
func escapeMarkdown(s string, atStart bool) string {
	var b strings.Builder
	for i := 0; i < len(s); i++ {
		switch c := s[i]; {
		case strings.IndexByte("\\`*_[]<>&|~$@#", c) >= 0,
			c == ':' && strings.HasPrefix(s[i:], "://"),
			c == '.' && i >= 3 && strings.EqualFold(s[i-3:i], "www"),
			c == '!' && strings.HasPrefix(s[i:], "!["):
			b.WriteByte('\\')
		case atStart && strings.IndexByte("+-=", c) >= 0 && strings.TrimSpace(s[:i]) == "",
			atStart && (c == '.' || c == ')') && i > 0 && strings.Trim(s[:i], "0123456789") == "":
			b.WriteByte('\\')
		}
		b.WriteByte(s[i])
	}
	return b.String()
}

// guardCSV writes text so that a spreadsheet takes it as text: a leading apostrophe keeps = + - @ and
// their full-width forms from beginning a formula. The apostrophe is part of the field for other readers.
func guardCSV(s string) string {
	first, _ := utf8.DecodeRuneInString(strings.TrimLeft(s, " \u00a0"))
	if strings.ContainsRune("=+-@＝＋－＠", first) && s != "" {
		return "'" + s
	}
	return s
}

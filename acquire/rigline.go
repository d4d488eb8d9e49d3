package acquire

import (
	"errors"
	"strings"

	"github.com/BurntSushi/toml"
)

// syntaxError gives an error of the TOML reader the form of the others.
func syntaxError(file string, err error) error {
	var parse toml.ParseError
	if errors.As(err, &parse) {
		return &RigError{File: file, Line: parse.Position.Line, Key: parse.LastKey, Err: errors.New(parse.Message)}
	}
	return &RigError{File: file, Err: errors.New(strings.TrimPrefix(err.Error(), "toml: "))}
}

// refuse is a TOML value that cannot be read. The reader's error then says where it stands, which it
// tells in no other way.
type refuse struct{}

var errRefuse = errors.New("refused")

func (refuse) UnmarshalTOML(any) error { return errRefuse }

// lineOf gives the line of a key, or of the innermost table round it that the text has; 0 for none.
func lineOf(text string, key []string) int {
	var level map[string]toml.Primitive
	meta, err := toml.Decode(text, &level)
	if err != nil {
		return 0
	}
	line := 0
	for _, k := range key {
		value, ok := level[k]
		if !ok {
			return line
		}
		var parse toml.ParseError
		if errors.As(meta.PrimitiveDecode(value, &refuse{}), &parse) && parse.Position.Line > 0 {
			line = parse.Position.Line
		}
		level = nil
		if meta.PrimitiveDecode(value, &level) != nil {
			return line // a value, not a table
		}
	}
	return line
}

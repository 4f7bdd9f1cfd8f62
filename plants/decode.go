package plants

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"reflect"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2"
)

// Bounds on what is read at all.
const (
	maxFile    = 1 << 20 // bytes
	maxNesting = 32      // JSON arrays and objects within each other; the TOML parser has its own bound
)

// Decode reads a TOML file, or a JSON file where the name ends in ".json",
// into the struct that dst points to, whose fields carry `toml:"key"` tags.
// It is strict: every key must be known, spelled exactly and given once.
// The error is an *Error with the line (syntax) or the key.
func Decode(file string, data []byte, dst any) error {
	if len(data) > maxFile {
		return &Error{File: file, Wrong: fmt.Sprintf("%d bytes long", len(data)), Expected: fmt.Sprintf("expected at most %d", maxFile)}
	}
	if !utf8.Valid(data) {
		return &Error{File: file, Wrong: "not UTF-8 text", Expected: "expected a text file in UTF-8"}
	}
	data = bytes.TrimPrefix(data, []byte("\ufeff"))
	read := tomlTree
	if strings.HasSuffix(strings.ToLower(file), ".json") {
		read = jsonTree
	}
	tree, bad := read(data)
	if bad == nil {
		bad = bind(tree, reflect.ValueOf(dst).Elem(), "")
	}
	if bad != nil {
		bad.File = file
		return bad
	}
	return nil
}

func tomlTree(data []byte) (any, *Error) {
	var tree map[string]any
	if err := toml.Unmarshal(data, &tree); err != nil {
		bad := &Error{Wrong: strings.TrimPrefix(err.Error(), "toml: "), Expected: "expected a TOML file"}
		if d, ok := errors.AsType[*toml.DecodeError](err); ok {
			line, column := d.Position()
			bad.Where = fmt.Sprintf("line %d, column %d", line, column)
		}
		return nil, bad
	}
	return tree, nil
}

func jsonTree(data []byte) (any, *Error) {
	d := json.NewDecoder(bytes.NewReader(data))
	d.UseNumber()
	tree, err := jsonValue(d, 0)
	if err == nil {
		if _, more := d.Token(); more != io.EOF {
			err = errors.New("text after the end of the object")
		}
	}
	if err == nil {
		return tree, nil
	}
	offset := d.InputOffset()
	if s, ok := errors.AsType[*json.SyntaxError](err); ok {
		offset = s.Offset
	}
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		err, offset = errors.New("ends too early"), int64(len(data))
	}
	line := 1 + bytes.Count(data[:min(int(offset), len(data))], []byte("\n"))
	return nil, &Error{Where: fmt.Sprintf("line %d", line), Wrong: strings.TrimPrefix(err.Error(), "json: "), Expected: "expected a JSON file"}
}

func jsonValue(d *json.Decoder, depth int) (any, error) {
	if depth > maxNesting {
		return nil, fmt.Errorf("more than %d brackets within each other", maxNesting)
	}
	t, err := d.Token()
	if err != nil {
		return nil, err
	}
	switch t := t.(type) {
	case json.Number:
		v, err := strconv.ParseFloat(t.String(), 64)
		if err != nil {
			return nil, fmt.Errorf("the number %s is out of range", quoted(t.String()))
		}
		return v, nil
	case json.Delim:
		if t == '[' {
			list := []any{}
			for d.More() {
				v, err := jsonValue(d, depth+1)
				if err != nil {
					return nil, err
				}
				list = append(list, v)
			}
			_, err := d.Token()
			return list, err
		}
		table := map[string]any{}
		for d.More() {
			k, err := d.Token()
			if err != nil {
				return nil, err
			}
			key, _ := k.(string)
			if _, twice := table[key]; twice {
				return nil, fmt.Errorf("the key %s appears twice", quoted(key))
			}
			if table[key], err = jsonValue(d, depth+1); err != nil {
				return nil, err
			}
		}
		_, err := d.Token()
		return table, err
	}
	return t, nil // string, bool or nil
}

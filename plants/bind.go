package plants

import (
	"fmt"
	"math"
	"reflect"
	"strings"
)

// entry is a matrix entry as written: a number or arithmetic.
type entry struct {
	text   string // empty for a number
	number float64
	parsed arithmetic // set by the parser of the plant where text is not empty
}

var entryType = reflect.TypeFor[entry]()

// bind copies a tree of maps, lists and scalars into v, strictly. Keys come
// from the fields' toml tags. path names the place of v in words.
func bind(tree any, v reflect.Value, path string) *Error {
	if v.Type() == entryType {
		return bindEntry(tree, v, path)
	}
	switch v.Kind() {
	case reflect.Pointer:
		v.Set(reflect.New(v.Type().Elem()))
		return bind(tree, v.Elem(), path)
	case reflect.Struct:
		return bindStruct(tree, v, path)
	case reflect.Map:
		table, ok := tree.(map[string]any)
		if !ok {
			return mismatch(path, tree, "a table")
		}
		v.Set(reflect.MakeMap(v.Type()))
		for _, key := range sortedKeysOf(table) {
			item := reflect.New(v.Type().Elem()).Elem()
			if bad := bind(table[key], item, where(path, shortened(key))); bad != nil {
				return bad
			}
			v.SetMapIndex(reflect.ValueOf(key), item)
		}
	case reflect.Slice:
		return bindList(tree, v, path)
	case reflect.String:
		s, ok := tree.(string)
		if !ok {
			return mismatch(path, tree, "a text in quotes")
		}
		v.SetString(s)
	case reflect.Bool:
		b, ok := tree.(bool)
		if !ok {
			return mismatch(path, tree, "true or false")
		}
		v.SetBool(b)
	case reflect.Float64:
		f, ok := number(tree)
		if !ok {
			return mismatch(path, tree, "a number")
		}
		if math.IsNaN(f) || math.IsInf(f, 0) {
			return &Error{Where: path, Wrong: fmt.Sprintf("%g", f), Expected: "expected a finite number"}
		}
		v.SetFloat(f)
	case reflect.Int, reflect.Int64:
		f, ok := number(tree)
		if !ok || f != math.Trunc(f) || math.Abs(f) > 1<<52 {
			return mismatch(path, tree, "a whole number")
		}
		v.SetInt(int64(f))
	default:
		return mismatch(path, tree, "nothing of this kind")
	}
	return nil
}

func bindEntry(tree any, v reflect.Value, path string) *Error {
	e := entry{}
	if s, ok := tree.(string); ok {
		e.text = s
		if strings.TrimSpace(s) == "" {
			return &Error{Where: path, Wrong: "an empty text", Expected: "expected a number or arithmetic"}
		}
	} else {
		f, ok := number(tree)
		if !ok {
			return mismatch(path, tree, "a number or arithmetic in quotes")
		}
		if math.IsNaN(f) || math.IsInf(f, 0) {
			return &Error{Where: path, Wrong: fmt.Sprintf("%g", f), Expected: "expected a finite number"}
		}
		e.number = f
	}
	v.Set(reflect.ValueOf(e))
	return nil
}

func bindStruct(tree any, v reflect.Value, path string) *Error {
	table, ok := tree.(map[string]any)
	if !ok {
		return mismatch(path, tree, "a table")
	}
	fields := map[string]int{}
	var known []string
	for i := range v.NumField() {
		if key := v.Type().Field(i).Tag.Get("toml"); key != "" {
			fields[key] = i
			known = append(known, key)
		}
	}
	for _, key := range sortedKeysOf(table) {
		i, ok := fields[key]
		if !ok {
			return &Error{Where: where(path, shortened(key)), Wrong: "unknown key", Expected: "expected one of " + strings.Join(known, ", ")}
		}
		if bad := bind(table[key], v.Field(i), where(path, key)); bad != nil {
			return bad
		}
	}
	return nil
}

func bindList(tree any, v reflect.Value, path string) *Error {
	list, ok := tree.([]any)
	if !ok {
		if _, table := tree.(map[string]any); table && v.Type().Elem().Kind() == reflect.Struct && v.Type().Elem() != entryType {
			return mismatch(path, tree, fmt.Sprintf("blocks [[%s]]", path))
		}
		return mismatch(path, tree, "a list")
	}
	step := "entry %d"
	switch elem := v.Type().Elem(); {
	case elem.Kind() == reflect.Slice:
		step = "row %d"
	case elem.Kind() == reflect.Struct && elem != entryType:
		step = ""
	case strings.Contains(path, "row "):
		step = "column %d"
	}
	v.Set(reflect.MakeSlice(v.Type(), len(list), len(list)))
	for i, item := range list {
		place := fmt.Sprintf("%s %d", path, i+1)
		if step != "" {
			place = where(path, fmt.Sprintf(step, i+1))
		}
		if bad := bind(item, v.Index(i), place); bad != nil {
			return bad
		}
	}
	return nil
}

func number(tree any) (float64, bool) {
	switch t := tree.(type) {
	case float64:
		return t, true
	case int64:
		return float64(t), true
	}
	return 0, false
}

func mismatch(path string, tree any, expected string) *Error {
	have := "a date or time"
	switch t := tree.(type) {
	case nil:
		have = "nothing"
	case string:
		have = "the text " + quoted(t)
	case bool:
		have = fmt.Sprint(t)
	case float64, int64:
		have = fmt.Sprintf("the number %v", t)
	case []any:
		have = "a list"
	case map[string]any:
		have = "a table"
	}
	return &Error{Where: path, Wrong: have, Expected: "expected " + expected}
}

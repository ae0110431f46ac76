package physics

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2"
)

// longestName bounds names and labels, in characters.
const longestName = 80

// document is a TOML file that is being read. It keeps its first error, after
// which every value reads as the zero of its type.
type document struct {
	file     string
	data     []byte
	at       positions
	firstErr *Error
}

// parse reads TOML. The error is an *Error.
func parse(file string, data []byte) (*document, table, error) {
	d := &document{file: file, data: data}
	fail := func(line, column int, what string) (*document, table, error) {
		return nil, table{}, &Error{File: file, Line: line, Column: column, What: what}
	}
	if bad := firstNonText(data); bad >= 0 {
		line, column := lineColumn(data, bad)
		return fail(line, column, "not a text file: a scenario is TOML in UTF-8")
	}
	var values map[string]any
	if err := toml.Unmarshal(data, &values); err != nil {
		var decode *toml.DecodeError
		if !errors.As(err, &decode) {
			return fail(1, 1, notTOML(err))
		}
		line, column := decode.Position()
		return fail(line, inCharacters(data, line, column), notTOML(err))
	}
	if len(values) == 0 {
		return fail(1, 1, "the scenario is empty: it wants [luminosity] and at least one [[channel]]")
	}
	d.at = locate(data)
	return d, table{d, "", "the scenario", values}, nil
}

// notTOML words a syntax error.
func notTOML(err error) string {
	what := strings.TrimPrefix(err.Error(), "toml: ")
	switch {
	case strings.HasPrefix(what, "expected keyword"),
		strings.HasPrefix(what, "strings must be quoted"),
		strings.HasPrefix(what, "unexpected character") && strings.HasSuffix(what, "at start of value"):
		what = "a value must be text in quotes, a number, a list in [ ] or a table in { }"
	case strings.HasSuffix(what, "is already defined"):
		what = strings.TrimSuffix(what, "is already defined") + "is given twice"
	}
	return "not valid TOML: " + what
}

// firstNonText finds the first byte that is not UTF-8 text, -1 if there is none.
func firstNonText(data []byte) int {
	for i := 0; i < len(data); {
		r, size := utf8.DecodeRune(data[i:])
		if r == utf8.RuneError && size == 1 || r == 0 {
			return i
		}
		i += size
	}
	return -1
}

// err is the first error.
func (d *document) err() error {
	if d.firstErr == nil {
		return nil
	}
	return d.firstErr
}

func (d *document) failed() bool { return d.firstErr != nil }

// fail notes an error at the place of a path, or of the nearest table around it.
func (d *document) fail(path, format string, args ...any) {
	if d.failed() {
		return
	}
	offset, known := d.at[path]
	for !known && path != "" {
		path = path[:strings.LastIndexByte(path, 0)]
		offset, known = d.at[path]
	}
	line, column := lineColumn(d.data, offset)
	d.firstErr = &Error{d.file, line, column, fmt.Sprintf(format, args...)}
}

// table is a table of a document with its path, and its name in messages.
type table struct {
	*document
	path   string
	name   string
	values map[string]any
}

func (t table) has(key string) bool {
	_, ok := t.values[key]
	return ok
}

// failKey notes an error at a key of the table.
func (t table) failKey(key, format string, args ...any) {
	t.fail(join(t.path, key), format, args...)
}

// missing notes the lack of a key.
func (t table) missing(key, example string) {
	t.fail(t.path, "%s has no %s: write %s", t.name, key, example)
}

// only refuses every key but those given, the first in the file first.
func (t table) only(keys ...string) {
	var unknown []string
	for key := range t.values {
		if !slices.Contains(keys, key) {
			unknown = append(unknown, key)
		}
	}
	if len(unknown) == 0 {
		return
	}
	key := slices.MinFunc(unknown, func(a, b string) int {
		return t.at[join(t.path, a)] - t.at[join(t.path, b)]
	})
	t.failKey(key, "unknown key %s in %s: %s", shown(key), t.name, Suggest(key, keys))
}

// found says in plain words what kind of value was written.
func found(value any) string {
	switch v := value.(type) {
	case string:
		return "text"
	case bool:
		return "true or false"
	case int64, float64:
		return "a number"
	case []any:
		if len(v) > 0 {
			if _, ok := v[0].(map[string]any); ok {
				return "a list of tables"
			}
		}
		return "a list"
	case map[string]any:
		return "a table"
	case time.Time, toml.LocalDate, toml.LocalTime, toml.LocalDateTime:
		return "a date or time"
	}
	return "something else"
}

func (d *document) wrongType(path, key, wanted string, value any) {
	d.fail(path, "%s must be %s, not %s", key, wanted, found(value))
}

// numberAt reads a finite number.
func (d *document) numberAt(path, key string, value any) float64 {
	var x float64
	switch v := value.(type) {
	case int64:
		x = float64(v)
	case float64:
		x = v
	default:
		d.wrongType(path, key, "a number", value)
		return 0
	}
	if math.IsNaN(x) || math.IsInf(x, 0) {
		d.fail(path, "%s is %v, must be finite", key, x)
		return 0
	}
	return x
}

// number reads a finite number under a key that is there.
func (t table) number(key string) float64 {
	return t.numberAt(join(t.path, key), key, t.values[key])
}

// numbers reads a list of finite numbers under a key that is there.
func (t table) numbers(key, wanted string) []float64 {
	path := join(t.path, key)
	list, ok := t.values[key].([]any)
	if !ok {
		t.wrongType(path, key, wanted, t.values[key])
		return nil
	}
	out := make([]float64, len(list))
	for i, v := range list {
		out[i] = t.numberAt(joinIndex(path, i), "an entry of "+key, v)
	}
	return out
}

// whole reads a whole number from 1 to most under a key that is there.
func (t table) whole(key string, least, most int64) int {
	n, ok := t.values[key].(int64)
	if !ok {
		if x, isFloat := t.values[key].(float64); isFloat {
			t.failKey(key, "%s is %v, must be a whole number from %v to %v", key, x, least, most)
		} else {
			t.wrongType(join(t.path, key), key, "a whole number", t.values[key])
		}
		return 0
	}
	if n < least || n > most {
		t.failKey(key, "%s is %v, must be from %v to %v", key, n, least, most)
		return 0
	}
	return int(n)
}

// text reads a name or label under a key that is there.
func (t table) text(key string) string {
	return t.labelAt(join(t.path, key), key, t.values[key])
}

func (d *document) labelAt(path, key string, value any) string {
	s, ok := value.(string)
	if !ok {
		d.wrongType(path, key, "text in quotes", value)
		return ""
	}
	if what := badLabel(s); what != "" {
		d.fail(path, "%s %s", key, what)
		return ""
	}
	return s
}

func badLabel(s string) string {
	if strings.TrimSpace(s) == "" {
		return "is blank: write at least one letter"
	}
	if n := utf8.RuneCountInString(s); n > longestName {
		return fmt.Sprintf("has %v characters, at most %v are allowed", n, longestName)
	}
	for _, r := range s {
		if !unicode.IsPrint(r) {
			return fmt.Sprintf("holds the character %U, which cannot be printed", r)
		}
	}
	return ""
}

// texts reads a list of names under a key that is there; a single name counts
// as a list where that is allowed.
func (t table) texts(key string, single bool) []string {
	path := join(t.path, key)
	value := t.values[key]
	wanted := "a list of names"
	if single {
		if _, ok := value.(string); ok {
			return []string{t.text(key)}
		}
		wanted = "a name or a list of names"
	}
	list, ok := value.([]any)
	if !ok {
		t.wrongType(path, key, wanted, value)
		return nil
	}
	if len(list) == 0 {
		t.fail(path, "%s is an empty list: name at least one", key)
		return nil
	}
	out := make([]string, len(list))
	for i, v := range list {
		out[i] = t.labelAt(joinIndex(path, i), "an entry of "+key, v)
	}
	return out
}

// table reads a table under a key that is there.
func (t table) table(key, name string) table {
	path := join(t.path, key)
	values, ok := t.values[key].(map[string]any)
	if !ok {
		t.wrongType(path, key, "a table", t.values[key])
	}
	return table{t.document, path, name, values}
}

// tables reads a list of tables, which may be absent. Each is called name until
// it says its own.
func (t table) tables(key, name, header string) []table {
	if !t.has(key) {
		return nil
	}
	path := join(t.path, key)
	list, ok := t.values[key].([]any)
	if !ok {
		t.wrongType(path, key, "a list of tables, each written "+header, t.values[key])
		return nil
	}
	out := make([]table, 0, len(list))
	for i, v := range list {
		entry := joinIndex(path, i)
		values, ok := v.(map[string]any)
		if !ok {
			t.wrongType(entry, "an entry of "+key, "a table", v)
			return nil
		}
		out = append(out, table{t.document, entry, name, values})
	}
	return out
}

// withoutMark drops the byte order mark that some editors put before a text.
func withoutMark(data []byte) []byte {
	return bytes.TrimPrefix(data, []byte("\ufeff"))
}

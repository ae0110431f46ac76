package physics

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
)

// events is what a template file holds.
type events struct {
	path      string
	fractions []float64 // of the events in each bin; they sum to 1
	// errors are the statistical errors of the fractions; nil where the file has
	// none.
	errors []float64
	at     []place // of the events of each bin in the file
}

// place is a line and a column of a text, from 1, the column in characters.
type place struct{ line, column int }

// readTemplate reads the CSV file that a key names by a path relative to the
// scenario. It gives nil where that fails.
func (t table) readTemplate(key string, b binning) *events {
	name := t.text(key)
	if t.failed() {
		return nil
	}
	path := name
	if !filepath.IsAbs(name) {
		path = filepath.Join(filepath.Dir(t.file), name)
	}
	data, what := readFile(path)
	if what != "" {
		t.failKey(key, "template %q: %s", name, what)
		return nil
	}
	out, err := readEvents(path, withoutMark(data), b)
	if err != nil {
		t.firstErr = err
		return nil
	}
	return out
}

// templateColumns are those of a template; the last may be left out.
var templateColumns = []string{"low", "high", "events", "error"}

var (
	templateHeader = strings.Join(templateColumns[:3], ",")
	errorHeader    = strings.Join(templateColumns, ",")
)

// readEvents reads a line for each bin under the header.
func readEvents(path string, data []byte, b binning) (*events, *Error) {
	if bad := firstNonText(data); bad >= 0 {
		line, column := lineColumn(data, bad)
		return nil, &Error{path, line, column, "not a text file: a template is CSV in UTF-8"}
	}
	lines := csv.NewReader(bytes.NewReader(data))
	lines.Comment = '#'
	lines.TrimLeadingSpace = true
	lines.FieldsPerRecord = -1
	fail := func(line, column int, format string, args ...any) *Error {
		return &Error{path, line, inCharacters(data, line, column), fmt.Sprintf(format, args...)}
	}
	at := func(field int, format string, args ...any) *Error {
		line, column := lines.FieldPos(field)
		return fail(line, column, format, args...)
	}

	line, err := lines.Read()
	if errors.Is(err, io.EOF) {
		return nil, fail(1, 1, "the template is empty: its first line must be %s or %s", templateHeader, errorHeader)
	}
	columns := len(line)
	if err == nil {
		for i := range line {
			line[i] = strings.TrimSpace(line[i])
		}
		if header := strings.Join(line, ","); header != templateHeader && header != errorHeader {
			return nil, at(0, "the first line is %s, must be %s or %s", shown(header), templateHeader, errorHeader)
		}
	}
	out := &events{path: path}
	var counts []float64
	tolerance := 1e-9 * b.window()
	previous := math.NaN()
	for err == nil {
		line, err = lines.Read()
		if err != nil {
			break
		}
		if len(line) != columns {
			return nil, at(0, "there are %v columns, must be the %v of the first line, %s", len(line), columns, strings.Join(templateColumns[:columns], ","))
		}
		var row [4]float64
		for i, field := range line {
			x, err := strconv.ParseFloat(strings.TrimSpace(field), 64)
			if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
				return nil, at(i, "%s is not a finite number", shown(field))
			}
			row[i] = x
		}
		low, high := row[0], row[1]
		bin := len(counts)
		switch {
		case bin == b.bins:
			return nil, at(0, "there are more lines than the %v bins of the channel", b.bins)
		case low > previous+tolerance:
			return nil, at(0, "there is a gap from %v to %v: low must be the high of the line before", previous, low)
		case low < previous-tolerance:
			return nil, at(0, "low is %v, must be the high of the line before, %v", low, previous)
		case math.Abs(low-b.edge(bin)) > tolerance:
			return nil, at(0, "low is %v, but bin %v of the channel begins at %v", low, bin+1, b.edge(bin))
		case math.Abs(high-b.edge(bin+1)) > tolerance:
			return nil, at(1, "high is %v, but bin %v of the channel ends at %v", high, bin+1, b.edge(bin+1))
		}
		for i, x := range row[2:columns] {
			if x < 0 {
				return nil, at(2+i, "%s is %v, must be 0 or above", templateColumns[2+i], x)
			}
		}
		previous = high
		counts = append(counts, row[2])
		if columns == 4 {
			out.errors = append(out.errors, row[3])
		}
		start, column := lines.FieldPos(2)
		out.at = append(out.at, place{start, inCharacters(data, start, column)})
	}
	if !errors.Is(err, io.EOF) {
		var parse *csv.ParseError
		if errors.As(err, &parse) {
			return nil, fail(parse.Line, parse.Column, "not valid CSV: %v", parse.Err)
		}
		return nil, &Error{File: path, What: reason(err)}
	}
	last := 1 + bytes.Count(bytes.TrimRight(data, "\r\n"), []byte{'\n'})
	if len(counts) < b.bins {
		return nil, fail(last, 1, "there are %v lines of events, must be one for each of the %v bins of the channel", len(counts), b.bins)
	}
	if slices.Max(counts) == 0 {
		return nil, fail(last, 1, "all events are 0: a template needs a bin that is not empty")
	}
	out.normalise(counts)
	return out, nil
}

// normalise turns events, not all zero, into fractions, and their errors
// likewise. Scaling by the largest first keeps the sum finite.
func (e *events) normalise(counts []float64) {
	largest := slices.Max(counts)
	e.fractions = make([]float64, len(counts))
	total := 0.0
	for i, n := range counts {
		e.fractions[i] = n / largest
		total += e.fractions[i]
	}
	for i := range e.fractions {
		e.fractions[i] /= total
	}
	for i := range e.errors {
		e.errors[i] = e.errors[i] / largest / total
	}
}

// refuseEmpty finds a bin that is empty here and not in the nominal fractions:
// no ratio leads from one to the other.
func (e *events) refuseEmpty(nominal []float64) *Error {
	for i, f := range nominal {
		if e.fractions[i] == 0 && f > 0 {
			return &Error{e.path, e.at[i].line, e.at[i].column, "events is 0, but the nominal template has some in this bin: no ratio leads from one to the other, so merge it with a neighbour"}
		}
	}
	return nil
}

package physics

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strconv"
	"strings"

	"lumireach/stats"
)

// readTemplate reads a CSV file, whose path is relative to the scenario, into a
// shape over the bins.
func (t table) readTemplate(name string, b binning) stats.Shape {
	if t.failed() {
		return nil
	}
	path := name
	if !filepath.IsAbs(name) {
		path = filepath.Join(filepath.Dir(t.file), name)
	}
	data, what := readFile(path)
	if what != "" {
		t.failKey("file", "template %q: %s", name, what)
		return nil
	}
	events, err := readEvents(path, withoutMark(data), b)
	if err != nil {
		t.firstErr = err
		return nil
	}
	return newTemplate(events)
}

// readEvents reads the events of each bin from lines low,high,events.
func readEvents(path string, data []byte, b binning) ([]float64, *Error) {
	if bad := firstNonText(data); bad >= 0 {
		line, column := lineColumn(data, bad)
		return nil, &Error{path, line, column, "not a text file: a template is CSV in UTF-8"}
	}
	lines := csv.NewReader(bytes.NewReader(data))
	lines.Comment = '#'
	lines.TrimLeadingSpace = true
	lines.FieldsPerRecord = -1
	at := func(field int, format string, args ...any) *Error {
		line, column := lines.FieldPos(field)
		return &Error{path, line, column, fmt.Sprintf(format, args...)}
	}

	const header = "low,high,events"
	line, err := lines.Read()
	if errors.Is(err, io.EOF) {
		return nil, &Error{path, 1, 1, "the template is empty: its first line must be " + header}
	}
	if err == nil {
		for i := range line {
			line[i] = strings.TrimSpace(line[i])
		}
		switch strings.Join(line, ",") {
		case header:
		case header + ",error":
			return nil, at(3, "statistical errors of templates are not treated yet: leave the column error out")
		default:
			return nil, at(0, "the first line is %s, must be %s", shown(strings.Join(line, ",")), header)
		}
	}
	events := make([]float64, 0, b.bins)
	tolerance := 1e-9 * b.window()
	total, previous := 0.0, math.NaN()
	for err == nil {
		line, err = lines.Read()
		if err != nil {
			break
		}
		if len(line) != 3 {
			return nil, at(0, "there are %v columns, must be the three of %s", len(line), header)
		}
		var row [3]float64
		for i, field := range line {
			x, err := strconv.ParseFloat(strings.TrimSpace(field), 64)
			if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
				return nil, at(i, "%s is not a finite number", shown(field))
			}
			row[i] = x
		}
		low, high, n := row[0], row[1], row[2]
		bin := len(events)
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
		case n < 0:
			return nil, at(2, "events is %v, must be 0 or above", n)
		}
		previous = high
		events = append(events, n)
		total = math.Max(total, n)
	}
	if !errors.Is(err, io.EOF) {
		var parse *csv.ParseError
		if errors.As(err, &parse) {
			return nil, &Error{path, parse.Line, parse.Column, "not valid CSV: " + parse.Err.Error()}
		}
		return nil, &Error{File: path, What: reason(err)}
	}
	last := 1 + bytes.Count(bytes.TrimRight(data, "\r\n"), []byte{'\n'})
	if len(events) < b.bins {
		return nil, &Error{path, last, 1, fmt.Sprintf("there are %v lines of events, must be one for each of the %v bins of the channel", len(events), b.bins)}
	}
	if total == 0 {
		return nil, &Error{path, last, 1, "all events are 0: a template needs a bin that is not empty"}
	}
	return events, nil
}

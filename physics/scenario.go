package physics

import (
	"crypto/sha256"
	_ "embed"
	"encoding/hex"
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"lumireach/stats"
)

// Scenario is a search as its file describes it. It is made by Read or Demo,
// which check it; a caller may change luminosities, rates and sizes, not names.
type Scenario struct {
	Title  string
	Source string // path as given to Read, or "demonstration"
	SHA256 string // of the bytes of the file, in hexadecimal
	Unit   string // of luminosity, a label
	// Luminosities are positive and rise, in Unit.
	Luminosities  []float64
	Channels      []Channel
	Uncertainties []Uncertainty
}

// Channel is one selection of events: a count, or a window of bins.
type Channel struct {
	Name string
	Unit string // of the window, a label, "" if not given
	// Window holds its low and high edge in Unit, or nothing for a count
	// without one.
	Window    []float64
	Bins      int
	Edges     []float64 // of bins that are given by them, else nil
	Processes []Process // signals first, each in the order of the file
}

// Process is one source of events in a channel.
type Process struct {
	Name   string
	Signal bool
	// Rate is the selected events per unit luminosity in the channel's window,
	// at nominal parameters; for a signal at strength 1.
	Rate float64
	Form Form
	// Free lists what the data measure of a background: "rate" or quantities of
	// its form.
	Free []string
	// Tied is a label; backgrounds that share it share their free rate factor.
	Tied string

	shape  stats.Shape // nil in a channel of one bin
	errors []float64   // of a template: statistical errors of its fractions; nil without
}

// Form is the shape of a process over the window as the scenario gives it.
type Form struct {
	Kind         string // "" for a count without one
	Quantities   []Quantity
	Origin       float64   // of a power, in the channel's unit
	Coefficients []float64 // of a Bernstein polynomial, as given
	File         string    // of a template, as given
}

// Quantity is a number that a form depends on, in the channel's unit: a mean, a
// width, a slope (per unit), an exponent.
type Quantity struct {
	Name  string
	Value float64
}

// Uncertainty is one nuisance parameter with a unit normal constraint.
type Uncertainty struct {
	Name    string
	Effects []Effect
	// MeasuredAt is the luminosity, in Unit, at which the effects have the sizes
	// given; 0 for an uncertainty that does not shrink. Scale tells how.
	MeasuredAt float64
	Floor      float64 // fraction that never shrinks, 0 to 1
}

// Effect is what one standard deviation of an uncertainty does to one process
// of one channel.
type Effect struct {
	Channel string
	Process string
	Moves   string // "rate", a quantity of the process's form, or "template"
	// Size is relative, > -1, for rates and widths: a factor 1+Size.
	Size float64
	// Shift is absolute, for means and slopes, in the unit of the quantity.
	Shift float64
	// Up and Down are the factors on a rate at +1 and -1 standard deviation, > 0;
	// both 0 where Size says it.
	Up, Down float64
	// UpFile and DownFile are the templates at +1 and -1, as given.
	UpFile, DownFile string

	quantity int // of a template that is moved
}

//go:embed scenarios/demo.toml
var demoText string

// DemoText is the demonstration scenario as a file to start from.
func DemoText() string { return demoText }

// Demo is the demonstration scenario.
func Demo() *Scenario {
	s, err := read("demonstration", []byte(demoText))
	if err != nil {
		panic("physics: the demonstration scenario is not valid")
	}
	return s
}

// largestFile bounds scenarios and templates, in bytes.
const largestFile = 4 << 20

// Read reads and checks a scenario. Its errors are of type *Error.
func Read(path string) (*Scenario, error) {
	data, what := readFile(path)
	if what != "" {
		return nil, &Error{File: path, What: what}
	}
	return read(path, data)
}

// readFile reads a file whole, or says why that cannot be.
func readFile(path string) (data []byte, what string) {
	file, err := os.Open(path)
	if err != nil {
		return nil, reason(err)
	}
	defer file.Close()
	if info, err := file.Stat(); err == nil && info.IsDir() {
		return nil, "is a directory, must be a file"
	}
	data, err = io.ReadAll(io.LimitReader(file, largestFile+1))
	if err != nil {
		return nil, reason(err)
	}
	if len(data) > largestFile {
		return nil, "is larger than 4 MiB: not a scenario or template"
	}
	return data, ""
}

func reason(err error) string {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return "no such file"
	case errors.Is(err, fs.ErrPermission):
		return "may not be read: permission denied"
	}
	var path *fs.PathError
	if errors.As(err, &path) {
		return "cannot be read: " + path.Err.Error()
	}
	return "cannot be read: " + err.Error()
}

func read(path string, data []byte) (*Scenario, error) {
	sum := sha256.Sum256(data)
	d, top, err := parse(path, withoutMark(data))
	if err != nil {
		return nil, err
	}
	s := &Scenario{Source: path, SHA256: hex.EncodeToString(sum[:])}
	s.read(d, top)
	if err := d.err(); err != nil {
		return nil, err
	}
	return s, nil
}

func (s *Scenario) read(d *document, top table) {
	top.only("title", "luminosity", "channel", "uncertainty")
	if top.has("title") {
		s.Title = top.text("title")
	} else {
		base := filepath.Base(s.Source)
		s.Title = strings.TrimSuffix(base, filepath.Ext(base))
	}
	s.readLuminosity(top)
	s.readChannels(top)
	if !d.failed() {
		s.readUncertainties(top)
	}
	if !d.failed() {
		s.checkParameters(top)
	}
}

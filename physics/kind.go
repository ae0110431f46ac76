package physics

import (
	"math"
	"slices"

	"lumireach/stats"
)

// kind is a family of shapes: what the reader accepts and the compiler builds.
type kind struct {
	name       string
	quantities []quantity // in the order of Fill
	fromFile   bool       // events come from a CSV file instead of make
	make       func(binning) stats.Shape
	// more are keys that nothing moves; readMore takes what they say into the form.
	more     []string
	readMore func(t table, b binning, form *Form)
	makeFrom func(binning, Form) stats.Shape // in the place of make; may be nil
	// coordinates divides the window as make, check and bounds see it. Nil: as it is.
	coordinates func(binning, Form) binning
	// check says what is wrong with which nominal quantity, or "". May be nil.
	// Quantities that the form lacks are NaN.
	check func(b binning, at []float64) (key, what string)
}

// quantity is what an uncertainty may move, or a background leave free.
type quantity struct {
	key string
	// relative quantities are positive, moved by relative sizes, and handed to
	// Fill as logarithms.
	relative bool
	// dimension is the power of the window's unit that it carries.
	dimension int
	// partner names the quantity without which this one may be left out; "" for
	// one that no form lacks.
	partner string
	// bounds limits a free quantity, as offsets from its nominal value in the
	// units of Fill.
	bounds func(b binning, at float64) (lower, upper, step float64)
}

// local is a nominal value in the units of Fill.
func (q quantity) local(value float64) float64 {
	if q.relative {
		return math.Log(value)
	}
	return value
}

var kinds = []kind{uniformKind, exponentialKind, gaussianKind, powerKind, bernsteinKind, crystalBallKind, voigtKind, templateKind}

func kindNamed(name string) (kind, bool) {
	for _, k := range kinds {
		if k.name == name {
			return k, true
		}
	}
	return kind{}, false
}

// kind is the form's kind, with those quantities alone that the form has.
func (f Form) kind() kind {
	k, _ := kindNamed(f.Kind)
	if len(f.Quantities) == len(k.quantities) {
		return k
	}
	var given []quantity
	for _, q := range k.quantities {
		if f.has(q.key) {
			given = append(given, q)
		}
	}
	k.quantities = given
	return k
}

// has tells whether a form has a quantity of that name.
func (f Form) has(key string) bool {
	return slices.ContainsFunc(f.Quantities, func(q Quantity) bool { return q.Name == key })
}

func kindNames() []string {
	names := make([]string, len(kinds))
	for i, k := range kinds {
		names[i] = k.name
	}
	return names
}

func (k kind) quantityNames() []string {
	names := make([]string, len(k.quantities))
	for i, q := range k.quantities {
		names[i] = q.key
	}
	return names
}

// in divides the window as the functions of the kind see it.
func (k kind) in(b binning, form Form) binning {
	if k.coordinates == nil {
		return b
	}
	return k.coordinates(b, form)
}

// index is the place of a quantity in Fill, -1 if the kind has none of that name.
func (k kind) index(name string) int {
	for i, q := range k.quantities {
		if q.key == name {
			return i
		}
	}
	return -1
}

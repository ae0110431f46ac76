package physics

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"

	"lumireach/stats"
)

// FuzzRead: any bytes give either one line or a scenario that compiles to
// finite, non-negative expectations.
func FuzzRead(f *testing.F) {
	for _, pattern := range []string{
		"testdata/*.toml", "testdata/bench/*.toml", "scenarios/*.toml", "../testdata/bad/*.toml", "../testdata/scenarios/*.toml",
	} {
		paths, err := filepath.Glob(filepath.FromSlash(pattern))
		if err != nil || len(paths) == 0 {
			f.Fatalf("no seeds in %v (%v)", pattern, err)
		}
		for _, path := range paths {
			data, err := os.ReadFile(path)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(data)
		}
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		s, err := read(filepath.Join("testdata", "fuzzed.toml"), data)
		if err != nil {
			var typed *Error
			if !errors.As(err, &typed) || typed.Line < 1 || typed.Column < 1 {
				t.Fatalf("error %#v has no place", err)
			}
			if text := err.Error(); strings.ContainsAny(text, "\n\r") || len(text) > 2000 {
				t.Fatalf("error is not one readable line: %q", text)
			}
			return
		}
		luminosity := s.Luminosities[0]
		m, err := s.Model(luminosity)
		if err != nil {
			return // a product too large for any number
		}
		if len(s.Yields(luminosity).Parameters) != len(m.Params) {
			t.Fatal("yields and model differ in their parameters")
		}
		for _, c := range m.Channels {
			if c.Tau != nil && len(c.Tau) != c.Bins {
				t.Fatalf("%v bins have %v sizes of their simulation", c.Bins, len(c.Tau))
			}
			for _, tau := range c.Tau {
				if !(tau >= 0) || math.IsInf(tau, 1) {
					t.Fatalf("size of the simulation is %v", tau)
				}
			}
			for _, p := range c.Processes {
				if !(p.Yield >= 0) || math.IsInf(p.Yield, 1) {
					t.Fatalf("yield is %v", p.Yield)
				}
				if p.Shape != nil {
					checkFractions(t, p, c.Bins)
				}
				checkFinite(t, p.Rate)
				for _, move := range p.Move {
					checkFinite(t, move)
				}
			}
		}
		for _, p := range m.Params {
			if !(p.Step > 0) || !(p.Lower <= p.Nominal && p.Nominal <= p.Upper) {
				t.Fatalf("parameter %+v", p)
			}
		}
	})
}

func checkFractions(t *testing.T, p stats.Process, bins int) {
	fractions := make([]float64, bins)
	p.Shape.Fill(p.At, fractions, nil, nil)
	sum := 0.0
	for _, v := range fractions {
		if !(v >= 0) {
			t.Fatalf("a fraction is %v", v)
		}
		sum += v
	}
	if !(math.Abs(sum-1) < 1e-9) {
		t.Fatalf("fractions sum to %v", sum)
	}
}

func checkFinite(t *testing.T, effects []stats.Effect) {
	for _, e := range effects {
		if math.IsNaN(e.Lin+e.Bend) || math.IsInf(e.Lin+e.Bend, 0) || e.Lin == 0 && e.Bend == 0 || !(e.Scale >= 0 && e.Scale <= mostScale) || e.Bend != 0 && e.Scale == 0 {
			t.Fatalf("effect %+v", e)
		}
	}
}

// FuzzTemplate: any bytes give either one line or fractions that sum to one with
// errors that are not negative, and written out they give the same again.
func FuzzTemplate(f *testing.F) {
	b := equalBins(100, 160, 4)
	for _, pattern := range []string{"testdata/*.csv", "../testdata/bad/*.csv"} {
		paths, err := filepath.Glob(filepath.FromSlash(pattern))
		if err != nil || len(paths) == 0 {
			f.Fatalf("no seeds in %v (%v)", pattern, err)
		}
		for _, path := range paths {
			data, err := os.ReadFile(path)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(data)
		}
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		got, err := readEvents("fuzzed.csv", data, b)
		if err != nil {
			lines := strings.Split(string(data), "\n")
			if err.Line < 1 || err.Line > len(lines) || err.Column < 1 || err.Column > 1+utf8.RuneCountInString(lines[err.Line-1]) {
				t.Fatalf("error %#v has no place in %q", err, data)
			}
			if text := err.Error(); strings.ContainsAny(text, "\n\r") || len(text) > 1000 {
				t.Fatalf("error is not one readable line: %q", text)
			}
			return
		}
		sum := 0.0
		again := new(strings.Builder)
		again.WriteString("low,high,events,error\n")
		for i, v := range got.fractions {
			if !(v >= 0) {
				t.Fatalf("a fraction is %v", v)
			}
			sum += v
			e := 0.0
			if got.errors != nil {
				e = got.errors[i]
			}
			if !(e >= 0) {
				t.Fatalf("an error is %v", e)
			}
			fmt.Fprintf(again, "%v,%v,%v,%v\n", b.edge(i), b.edge(i+1), v, math.Min(e, math.MaxFloat64))
		}
		if len(got.fractions) != b.bins || !(math.Abs(sum-1) < 1e-14) {
			t.Fatalf("%v fractions sum to %v", len(got.fractions), sum)
		}
		second, err := readEvents("again.csv", []byte(again.String()), b)
		if err != nil {
			t.Fatalf("%v in\n%v", err, again)
		}
		for i, v := range second.fractions {
			if math.Abs(v-got.fractions[i]) > 1e-14 {
				t.Fatalf("fractions %v become %v", got.fractions, second.fractions)
			}
			if got.errors != nil && got.errors[i] < 1e300 && !(math.Abs(second.errors[i]-got.errors[i]) <= 1e-14*got.errors[i]) {
				t.Fatalf("errors %v become %v", got.errors, second.errors)
			}
		}
	})
}

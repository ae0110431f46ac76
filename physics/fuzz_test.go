package physics

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lumireach/stats"
)

// FuzzRead: any bytes give either one line or a scenario that compiles to
// finite, non-negative expectations.
func FuzzRead(f *testing.F) {
	for _, pattern := range []string{
		"testdata/*.toml", "testdata/bench/*.toml", "scenarios/*.toml", "../testdata/bad/*.toml",
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
		if math.IsNaN(e.Lin) || math.IsInf(e.Lin, 0) || e.Lin == 0 {
			t.Fatalf("effect %+v", e)
		}
	}
}

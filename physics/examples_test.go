package physics

import (
	"path/filepath"
	"testing"

	"lumireach/stats"
)

// TestExampleScenarios compiles the scenarios of neighbouring trades at three of
// their luminosities. The median significance passes 5 within the list, by the
// formulas that package stats holds to published values.
func TestExampleScenarios(t *testing.T) {
	paths, err := filepath.Glob(filepath.Join("..", "testdata", "scenarios", "*.toml"))
	if err != nil || len(paths) < 5 {
		t.Fatalf("%v example scenarios (%v), want at least 5", len(paths), err)
	}
	var pairs, shrinks, templates, simulation bool
	for _, path := range paths {
		t.Run(filepath.Base(path), func(t *testing.T) {
			s := mustRead(t, path)
			n := len(s.Luminosities)
			last := 0.0
			for i, l := range []float64{s.Luminosities[0], s.Luminosities[n/2], s.Luminosities[n-1]} {
				m := mustModel(t, s, l)
				e, err := stats.Prepare(m)
				if err != nil {
					t.Fatalf("at %v: %v", l, err)
				}
				z, err := e.MedianZ(1)
				if err != nil {
					t.Fatalf("at %v: %v", l, err)
				}
				if !(z > last) {
					t.Errorf("z is %v at %v, want more than the %v before", z, l, last)
				}
				if i == 0 && z >= 5 || i == 2 && z < 5 {
					t.Errorf("z is %v at %v, want 5 to be passed between %v and %v", z, l, s.Luminosities[0], s.Luminosities[n-1])
				}
				if got, want := len(s.Yields(l).Parameters), len(m.Params); got != want {
					t.Errorf("yields have %v parameters, the model %v", got, want)
				}
				last = z
			}
			for _, u := range s.Uncertainties {
				shrinks = shrinks || u.MeasuredAt > 0
				for _, e := range u.Effects {
					pairs = pairs || e.Up > 0
					templates = templates || e.UpFile != ""
				}
			}
			simulation = simulation || s.HasSimulationError()
		})
	}
	if !pairs || !shrinks || !templates || !simulation {
		t.Errorf("the examples have up and down: %v, shrinks: %v, moving templates: %v, simulation errors: %v; want all", pairs, shrinks, templates, simulation)
	}
}

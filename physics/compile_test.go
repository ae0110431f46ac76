package physics

import (
	"math"
	"path/filepath"
	"testing"

	"lumireach/stats"
)

func TestModel(t *testing.T) {
	s := mustRead(t, filepath.Join("testdata", "ostvik.toml"))
	m := mustModel(t, s, 20)

	want := []stats.Param{
		{Name: "two-photon continuum rate", Nominal: 1, Lower: 0, Upper: math.Inf(1), Step: 0.1},
		{Name: "two-photon continuum slope", Lower: 0.028 - 10, Upper: 0.028 + 10, Step: 1. / 60},
		{Name: "fakes rate", Nominal: 1, Lower: 0, Upper: math.Inf(1), Step: 0.1},
		{Name: "photon efficiency", Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1},
		{Name: "photon energy scale", Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1},
		{Name: "fake rate", Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1},
	}
	if len(m.Params) != len(want) {
		t.Fatalf("parameters are %+v, want %+v", m.Params, want)
	}
	for j, p := range m.Params {
		if p != want[j] {
			t.Errorf("parameter %v is %+v, want %+v", j, p, want[j])
		}
	}

	signal, continuum := m.Channels[0].Processes[0], m.Channels[0].Processes[1]
	if signal.Yield != 220 || !signal.Signal || signal.Factor != -1 {
		t.Errorf("signal is %+v, want 220 events of signal without a factor", signal)
	}
	checkEffects(t, "signal rate", signal.Rate, stats.Effect{Param: 3, Lin: math.Log(1.03)})
	checkEffects(t, "signal mean", signal.Move[0], stats.Effect{Param: 4, Lin: 0.4})
	checkEffects(t, "signal width", signal.Move[1])
	if signal.At[0] != 140 || signal.At[1] != math.Log(1.7) {
		t.Errorf("signal stands at %v, want mean 140 and ln 1.7", signal.At)
	}
	if continuum.Yield != 16800 || continuum.Signal || continuum.Factor != 0 || continuum.At[0] != -0.028 {
		t.Errorf("continuum is %+v, want 16800 events with factor 0 at slope -0.028", continuum)
	}
	checkEffects(t, "continuum slope", continuum.Move[0], stats.Effect{Param: 1, Lin: 1})
	checkEffects(t, "continuum rate", continuum.Rate)

	count, control := m.Channels[1], m.Channels[2]
	if count.Processes[1].Factor != 2 || control.Processes[0].Factor != 2 {
		t.Errorf("tied backgrounds have the factors %v and %v, want 2", count.Processes[1].Factor, control.Processes[0].Factor)
	}
	if count.Processes[0].Shape != nil || count.Bins != 1 {
		t.Errorf("a count has %v bins and the shape %v, want 1 and none", count.Bins, count.Processes[0].Shape)
	}
	checkEffects(t, "fakes", count.Processes[1].Rate, stats.Effect{Param: 5, Lin: math.Log(1.2)})
	checkEffects(t, "anti-correlated signal", count.Processes[0].Rate, stats.Effect{Param: 5, Lin: math.Log(0.95)})
	checkEffects(t, "control", control.Processes[0].Rate)
}

func checkEffects(t *testing.T, name string, got []stats.Effect, want ...stats.Effect) {
	t.Helper()
	if len(got) != len(want) {
		t.Errorf("%v: effects are %v, want %v", name, got, want)
		return
	}
	for i := range got {
		if got[i].Param != want[i].Param || !near(got[i].Lin, want[i].Lin) {
			t.Errorf("%v: effects are %v, want %v", name, got, want)
		}
	}
}

// TestModelEverything holds the rest: free quantities of a gaussian, a peak in
// one bin, an uncertainty of size 0.
func TestModelEverything(t *testing.T) {
	m := mustModel(t, mustRead(t, filepath.Join("testdata", "everything.toml")), 1)
	names := []string{"window hump rate", "window hump mean", "window hump width", "clock", "scale", "shape of the hump", "switched off"}
	for j, p := range m.Params {
		if p.Name != names[j] {
			t.Errorf("parameter %v is called %q, want %q", j, p.Name, names[j])
		}
	}
	hump := m.Channels[0].Processes[2]
	checkEffects(t, "mean", hump.Move[0], stats.Effect{Param: 1, Lin: 1}, stats.Effect{Param: 5, Lin: -1})
	checkEffects(t, "width", hump.Move[1], stats.Effect{Param: 2, Lin: 1}, stats.Effect{Param: 5, Lin: math.Log(0.8)})
	if p := m.Params[1]; p.Lower != -60 || p.Upper != 60 || !(p.Step > 0) || p.Constrained {
		t.Errorf("free mean is %+v, want a window of 60 on either side", p)
	}
	if p := m.Params[2]; !near(p.Lower, -math.Log(10)) || !near(p.Upper, math.Log(10)) || !(p.Step > 0) {
		t.Errorf("free width is %+v, want a factor of 10 either way", p)
	}
	flat := m.Channels[0].Processes[3]
	checkEffects(t, "flat, with the size 0 left out", flat.Rate, stats.Effect{Param: 3, Lin: math.Log(1.1)})
	single := m.Channels[1].Processes[0]
	if single.Shape != nil || len(single.Move) != 0 {
		t.Errorf("a peak in one bin is %+v, want neither shape nor moves", single)
	}
}

// TestModelScales: yields are proportional to luminosity and nothing else is.
func TestModelScales(t *testing.T) {
	s := Demo()
	one, many := mustModel(t, s, 1), mustModel(t, s, 37)
	for i, c := range one.Channels {
		for k, p := range c.Processes {
			q := many.Channels[i].Processes[k]
			if !near(q.Yield, 37*p.Yield) || q.Shape == nil != (p.Shape == nil) {
				t.Errorf("process %v of channel %v: %+v at 37, %+v at 1", k, i, q, p)
			}
			checkEffects(t, "rate at 37", q.Rate, p.Rate...)
			for a := range p.Move {
				checkEffects(t, "move at 37", q.Move[a], p.Move[a]...)
			}
		}
	}
	for _, bad := range []float64{0, -1, math.NaN(), math.Inf(1), math.MaxFloat64} {
		if _, err := s.Model(bad); err == nil {
			t.Errorf("Model(%v) gives no error", bad)
		}
	}
}

// TestModelPrepares hands every scenario that is kept here to the fit.
func TestModelPrepares(t *testing.T) {
	paths, err := filepath.Glob(filepath.Join("testdata", "bench", "*.toml"))
	if err != nil || len(paths) != 3 {
		t.Fatalf("bench scenarios are %v (%v), want 3", paths, err)
	}
	parameters := map[string]int{"count.toml": 1, "window.toml": 5, "combination.toml": 18}
	for _, path := range paths {
		m := mustModel(t, mustRead(t, path), 1)
		if want := parameters[filepath.Base(path)]; len(m.Params) != want {
			t.Errorf("%v has %v parameters, want %v", path, len(m.Params), want)
		}
		if _, err := stats.Prepare(m); err != nil {
			t.Errorf("%v: %v", path, err)
		}
	}
	for _, path := range []string{"ostvik.toml", "everything.toml"} {
		if _, err := stats.Prepare(mustModel(t, mustRead(t, filepath.Join("testdata", path)), 10)); err != nil {
			t.Errorf("%v: %v", path, err)
		}
	}
}

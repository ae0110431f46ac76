package physics

import (
	"math"
	"path/filepath"
	"reflect"
	"testing"

	"lumireach/stats"
)

func uncertain(t *testing.T) *Scenario {
	t.Helper()
	return mustRead(t, filepath.Join("testdata", "uncertain.toml"))
}

func TestReadUncertain(t *testing.T) {
	s := uncertain(t)
	want := []Uncertainty{
		{Name: "efficiency", MeasuredAt: 8, Effects: []Effect{
			{Channel: "bulk", Process: "signal", Moves: "rate", Up: 1.25, Down: 0.9},
			{Channel: "skin", Process: "signal", Moves: "rate", Up: 1.25, Down: 0.9},
		}},
		{Name: "radon", MeasuredAt: 8, Floor: 0.5, Effects: []Effect{
			{Channel: "bulk", Process: "stone", Moves: "template", UpFile: "stone_up.csv", DownFile: "stone_down.csv"},
			{Channel: "skin", Process: "stone", Moves: "template", UpFile: "stone_up.csv", DownFile: "stone_down.csv"},
			{Channel: "bulk", Process: "stone", Moves: "rate", Up: 1.1, Down: 1.2},
			{Channel: "bulk", Process: "dust", Moves: "rate", Up: 1.1, Down: 1.2},
			{Channel: "skin", Process: "stone", Moves: "rate", Size: 0.3},
		}},
		{Name: "calibration", Effects: []Effect{
			{Channel: "bulk", Process: "stone", Moves: "template", UpFile: "stone_down.csv", DownFile: "stone.csv", quantity: 1},
			{Channel: "bulk", Process: "signal", Moves: "template", UpFile: "stone_down.csv", DownFile: "stone.csv"},
			{Channel: "skin", Process: "signal", Moves: "mean", Shift: 0.25},
		}},
	}
	if !reflect.DeepEqual(s.Uncertainties, want) {
		t.Errorf("uncertainties are\n%+v, want\n%+v", s.Uncertainties, want)
	}
}

// factorOf is what a rate's effect makes of it at θ, with the formula of
// stats.Effect written anew.
func factorOf(e stats.Effect, theta float64) float64 {
	x := e.Scale * theta
	g := math.Abs(x)
	if g < 1 {
		g = 1.5*x*x - 0.5*x*x*x*x
	}
	return math.Exp(e.Lin*theta + e.Bend*g)
}

// TestModelUpDown compares with direct powers of the factors: where k·θ is 1 the
// rate is up, at -1 down, beyond them powers of these.
func TestModelUpDown(t *testing.T) {
	s := uncertain(t)
	for _, tt := range []struct{ luminosity, k, kRadon float64 }{
		{8, 1, 1}, {2, 2, math.Sqrt(0.25 + 0.75*4)}, {32, 0.5, math.Sqrt(0.25 + 0.75/4)},
	} {
		m := mustModel(t, s, tt.luminosity)
		signal, stone, dust, skin := m.Channels[0].Processes[0], m.Channels[0].Processes[1], m.Channels[0].Processes[2], m.Channels[1].Processes[1]
		for _, rate := range []struct {
			name     string
			effects  []stats.Effect
			param    int
			k        float64
			up, down float64
		}{
			{"signal", signal.Rate, 1, tt.k, 1.25, 0.9},
			{"signal in skin", m.Channels[1].Processes[0].Rate, 1, tt.k, 1.25, 0.9},
			{"stone", stone.Rate, 2, tt.kRadon, 1.1, 1.2},
			{"dust", dust.Rate, 2, tt.kRadon, 1.1, 1.2},
			{"stone in skin", skin.Rate, 2, tt.kRadon, 1.3, 1 / 1.3},
		} {
			if len(rate.effects) != 1 || rate.effects[0].Param != rate.param {
				t.Fatalf("%v: effects %+v, want one of parameter %v", rate.name, rate.effects, rate.param)
			}
			for _, x := range []float64{1, -1, 2, -3, 0} {
				base := rate.up
				if x < 0 {
					base = rate.down
				}
				got, want := factorOf(rate.effects[0], x/rate.k), math.Pow(base, math.Abs(x))
				if math.Abs(got/want-1) > 1e-14 {
					t.Errorf("%v at luminosity %v: factor %v at %v/k, want %v", rate.name, tt.luminosity, got, x, want)
				}
			}
		}
		if e := skin.Rate[0]; e.Bend != 0 {
			t.Errorf("a size bends: %+v", e)
		}
		// Moves of templates and positions are k steps.
		checkEffects(t, "first move of stone", stone.Move[0], stats.Effect{Param: 2, Lin: tt.kRadon})
		checkEffects(t, "second move of stone", stone.Move[1], stats.Effect{Param: 3, Lin: 1})
		checkEffects(t, "move of stone in skin", skin.Move[0], stats.Effect{Param: 2, Lin: tt.kRadon})
		checkEffects(t, "move of the signal", signal.Move[0], stats.Effect{Param: 3, Lin: 1})
		checkEffects(t, "mean in skin", m.Channels[1].Processes[0].Move[0], stats.Effect{Param: 3, Lin: 0.25})
		if !reflect.DeepEqual(stone.At, []float64{0, 0}) || !reflect.DeepEqual(skin.At, []float64{0}) {
			t.Errorf("templates stand at %v and %v, want 0 everywhere", stone.At, skin.At)
		}
		if _, err := stats.Prepare(m); err != nil {
			t.Error(err)
		}
	}
}

// TestModelInverseFactors: up and 1/up are a size.
func TestModelInverseFactors(t *testing.T) {
	s := uncertain(t)
	s.Uncertainties[0].Effects[0].Up, s.Uncertainties[0].Effects[0].Down = 1.25, 0.8
	e := mustModel(t, s, 8).Channels[0].Processes[0].Rate[0]
	if !near(e.Lin, math.Log(1.25)) || e.Bend != 0 {
		t.Errorf("factors 1.25 and 0.8 give %+v, want ln 1.25 and no bend", e)
	}
}

// TestModelMovesTemplates follows the moves to fractions: 60, 20, 15, 5 of 100
// up and 6, 6, 4, 4 of 20 down, as in the files.
func TestModelMovesTemplates(t *testing.T) {
	m := mustModel(t, uncertain(t), 32)
	for _, tt := range []struct {
		name  string
		shape stats.Shape
		q     []float64
		want  []float64
	}{
		{"nominal", m.Channels[0].Processes[1].Shape, []float64{0, 0}, []float64{0.4, 0.3, 0.2, 0.1}},
		{"radon up", m.Channels[0].Processes[1].Shape, []float64{1, 0}, []float64{0.6, 0.2, 0.15, 0.05}},
		{"radon down", m.Channels[0].Processes[1].Shape, []float64{-1, 0}, []float64{0.3, 0.3, 0.2, 0.2}},
		{"calibration up", m.Channels[0].Processes[1].Shape, []float64{0, 1}, []float64{0.3, 0.3, 0.2, 0.2}},
		{"calibration down", m.Channels[0].Processes[1].Shape, []float64{0, -1}, []float64{0.4, 0.3, 0.2, 0.1}},
		{"radon down in skin", m.Channels[1].Processes[1].Shape, []float64{-1}, []float64{0.3, 0.3, 0.2, 0.2}},
		// The last bin of the signal is empty and stays so: 6, 6, 4 of 16.
		{"signal, calibration up", m.Channels[0].Processes[0].Shape, []float64{1}, []float64{0.375, 0.375, 0.25, 0}},
	} {
		f := make([]float64, 4)
		tt.shape.Fill(tt.q, f, nil, nil)
		for i, want := range tt.want {
			if math.Abs(f[i]-want) > 1e-15 {
				t.Errorf("%v: bin %v holds %v, want %v", tt.name, i, f[i], want)
			}
		}
	}
}

// TestModelTau compares with (b/e)² by hand: in bulk stone gives 4, 3, 2, 1
// events with errors 0.6, 0, 0.4, 0.3, dust 0, 1, 1, 2 with 0, 0, 0.5, 1 and haze
// 2 in each bin without any; in skin half of stone alone; the veto 6 ± 20 %.
func TestModelTau(t *testing.T) {
	s := uncertain(t)
	want := [][]float64{
		{36 / 0.36, 0, 25 / (0.16 + 0.25), 25 / (0.09 + 1)},
		{4 / 0.09, 0, 1 / 0.04, 0.25 / 0.0225},
		{25},
	}
	check := func(luminosity float64, want [][]float64) {
		t.Helper()
		m := mustModel(t, s, luminosity)
		for i, c := range m.Channels {
			if len(c.Tau) != len(want[i]) {
				t.Errorf("channel %v at %v: sizes %v, want %v", i, luminosity, c.Tau, want[i])
				continue
			}
			for bin, tau := range c.Tau {
				if math.Abs(tau-want[i][bin]) > 1e-12*want[i][bin] {
					t.Errorf("channel %v, bin %v at %v: size %v, want %v", i, bin, luminosity, tau, want[i][bin])
				}
			}
		}
		if _, err := stats.Prepare(m); err != nil {
			t.Error(err)
		}
	}
	check(2, want)
	check(3e5, want)
	if !s.HasSimulationError() {
		t.Error("HasSimulationError is false, want true")
	}

	// A background of rate 0 has no error, nor has a signal.
	s.Channels[0].Processes[1].Rate = 0
	want[0] = []float64{0, 0, 9 / 0.25, 16.}
	check(2, want)
	for i := range s.Channels {
		for k := range s.Channels[i].Processes {
			if p := &s.Channels[i].Processes[k]; !p.Signal && p.errors != nil {
				p.Rate = 0
			}
		}
	}
	check(2, [][]float64{nil, nil, nil})
	if s.HasSimulationError() {
		t.Error("HasSimulationError is true without a background template, want false")
	}
	if Demo().HasSimulationError() {
		t.Error("HasSimulationError is true of the demonstration, want false")
	}
}

// TestModelRefusesErrors: a caller that takes the background away under an error
// is told.
func TestModelRefusesErrors(t *testing.T) {
	s := uncertain(t)
	stone := &s.Channels[1].Processes[1]
	stone.shape = template{[]float64{0, 0.5, 0.3, 0.2}}
	if _, err := s.Model(8); err == nil {
		t.Error("an error in an empty bin gives no error")
	}
}

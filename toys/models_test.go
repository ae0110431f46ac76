package toys

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lumireach/physics"
	"lumireach/stats"
)

// scenario reads one of the benchmark scenarios of physics, with parts of its
// text replaced.
func scenario(t testing.TB, name string, replace ...string) stats.Search {
	t.Helper()
	text, err := os.ReadFile("../physics/testdata/bench/" + name + ".toml")
	if err != nil {
		t.Fatal(err)
	}
	return read(t, strings.NewReplacer(replace...).Replace(string(text)))
}

// read is the search of a scenario given as text.
func read(t testing.TB, text string) stats.Search {
	t.Helper()
	path := filepath.Join(t.TempDir(), "scenario.toml")
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	s, err := physics.Read(path)
	if err != nil {
		t.Fatal(err)
	}
	return s.Model
}

// count is one bin of s and b events per unit of luminosity, b known exactly.
func count(s, b float64) stats.Search {
	return func(l float64) (stats.Model, error) {
		return stats.Model{Channels: []stats.Channel{{Bins: 1, Processes: []stats.Process{
			{Yield: s * l, Signal: true, Factor: -1},
			{Yield: b * l, Factor: -1},
		}}}}, nil
	}
}

// onOff is a count with a control region of tau times the background.
func onOff(s, b, tau float64) stats.Search {
	return func(l float64) (stats.Model, error) {
		m, err := count(s, b)(l)
		m.Channels[0].Processes[1].Factor = 0
		m.Channels = append(m.Channels, stats.Channel{Bins: 1, Processes: []stats.Process{{Yield: tau * b * l, Factor: 0}}})
		m.Params = []stats.Param{{Name: "background rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1}}
		return m, err
	}
}

// uncertain is a count whose background is known to a relative size.
func uncertain(s, b, size float64) stats.Search {
	return func(l float64) (stats.Model, error) {
		m, err := count(s, b)(l)
		m.Params = []stats.Param{{Name: "background", Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1}}
		m.Channels[0].Processes[1].Rate = []stats.Effect{{Param: 0, Lin: math.Log1p(size)}}
		return m, err
	}
}

// simulated is a count whose background comes from a simulation of so many
// events: the same as one with a control region of that many.
func simulated(s, b, tau float64) stats.Search {
	return func(l float64) (stats.Model, error) {
		m, err := count(s, b)(l)
		m.Channels[0].Tau = []float64{tau}
		return m, err
	}
}

func engine(t testing.TB, search stats.Search, luminosity float64) *stats.Engine {
	t.Helper()
	e, err := search.Engine(luminosity)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func testRunner(t testing.TB, c Config) *runner {
	t.Helper()
	if len(c.Luminosities) == 0 {
		c.Luminosities = []float64{1}
	}
	if err := c.complete(); err != nil {
		t.Fatal(err)
	}
	return newRunner(context.Background(), c)
}

func testWorker(e *stats.Engine, seed uint64) *worker {
	w := newWorker(e, e.Fitter(), 2, Fixed)
	w.stream.restart(key{seed: seed})
	return w
}

func mixtureOf(t testing.TB, proposals []proposal) *mixture {
	t.Helper()
	m, err := testRunner(t, Config{}).newMixture(proposals)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

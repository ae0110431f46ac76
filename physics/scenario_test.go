package physics

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"lumireach/stats"
)

func mustRead(t *testing.T, path string) *Scenario {
	t.Helper()
	s, err := Read(path)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func mustModel(t *testing.T, s *Scenario, luminosity float64) stats.Model {
	t.Helper()
	m, err := s.Model(luminosity)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func near(a, b float64) bool { return math.Abs(a-b) <= 1e-14*math.Abs(b) }

func TestRead(t *testing.T) {
	path := filepath.Join("testdata", "ostvik.toml")
	s := mustRead(t, path)
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(data)
	for i := range s.Channels {
		for k := range s.Channels[i].Processes {
			s.Channels[i].Processes[k].shape = nil
		}
	}
	want := &Scenario{
		Title: "Neutral resonance at the Ostvik ring", Source: path, SHA256: hex.EncodeToString(sum[:]),
		Unit: "fb⁻¹", Luminosities: []float64{1, 2, 5, 10, 20, 50, 100},
		Channels: []Channel{
			{Name: "two-photon", Window: []float64{110, 170}, Bins: 60, Processes: []Process{
				{Name: "signal", Signal: true, Rate: 11, Form: Form{Kind: "gaussian", Quantities: []Quantity{{"mean", 140}, {"width", 1.7}}}},
				{Name: "continuum", Rate: 840, Form: Form{Kind: "exponential", Quantities: []Quantity{{"slope", -0.028}}}, Free: []string{"rate", "slope"}},
			}},
			{Name: "tau count", Bins: 1, Processes: []Process{
				{Name: "signal", Signal: true, Rate: 1.4},
				{Name: "fakes", Rate: 3, Free: []string{"rate"}, Tied: "fakes"},
			}},
			{Name: "tau control", Bins: 1, Processes: []Process{
				{Name: "fakes", Rate: 24, Free: []string{"rate"}, Tied: "fakes"},
			}},
		},
		Uncertainties: []Uncertainty{
			{Name: "photon efficiency", Effects: []Effect{{Channel: "two-photon", Process: "signal", Moves: "rate", Size: 0.03}}},
			{Name: "photon energy scale", Effects: []Effect{{Channel: "two-photon", Process: "signal", Moves: "mean", Shift: 0.4}}},
			{Name: "fake rate", Effects: []Effect{
				{Channel: "tau count", Process: "fakes", Moves: "rate", Size: 0.2},
				{Channel: "tau count", Process: "signal", Moves: "rate", Size: -0.05},
			}},
		},
	}
	if !reflect.DeepEqual(s, want) {
		t.Errorf("Read(%v)\n got %+v\nwant %+v", path, s, want)
	}
}

func TestReadEverything(t *testing.T) {
	s := mustRead(t, filepath.Join("testdata", "everything.toml"))
	if s.Title != "everything" {
		t.Errorf("title is %q, want the name of the file", s.Title)
	}
	if len(s.Luminosities) != 3 || s.Luminosities[0] != 1 || !near(s.Luminosities[1], 10) || s.Luminosities[2] != 100 {
		t.Errorf("luminosities are %v, want 1, 10, 100", s.Luminosities)
	}
	if rate := s.Channels[0].Processes[0].Rate; rate != 8*0.5*0.5*0.75 {
		t.Errorf("rate is %v, want the product 1.5", rate)
	}
	fakes := s.Channels[0].Processes[4]
	f := make([]float64, 3)
	fakes.shape.Fill(nil, f, nil, nil)
	if f[0] != 0.25 || f[1] != 0 || f[2] != 0.75 || fakes.Form.File != "fakes.csv" {
		t.Errorf("template %q has the fractions %v, want 0.25, 0, 0.75 of fakes.csv", fakes.Form.File, f)
	}
	// One name in several channels is several effects.
	if n := len(s.Uncertainties[0].Effects); n != 3 {
		t.Errorf("clock has %v effects, want 3: narrow in two channels, flat in one", n)
	}
}

func TestReadUnreadable(t *testing.T) {
	directory := t.TempDir()
	large := filepath.Join(directory, "large.toml")
	if err := os.WriteFile(large, make([]byte, largestFile+1), 0o644); err != nil {
		t.Fatal(err)
	}
	missing := filepath.Join(directory, "missing.toml")
	for _, tt := range []struct{ path, want string }{
		{directory, directory + ": is a directory, must be a file"},
		{missing, missing + ": no such file"},
		{filepath.Join(large, "below"), filepath.Join(large, "below") + ": cannot be read: not a directory"},
		{large, large + ": is larger than 4 MiB: not a scenario or template"},
		{"", ": no such file"},
	} {
		_, err := Read(tt.path)
		var typed *Error
		if !errors.As(err, &typed) || err.Error() != tt.want {
			t.Errorf("Read(%q) = %v, want %v", tt.path, err, tt.want)
		}
	}
}

// TestReadForgiving holds what editors of other systems write.
func TestReadForgiving(t *testing.T) {
	text := strings.ReplaceAll("\ufeff"+demoText, "\n", "\r\n")
	path := filepath.Join(t.TempDir(), "demo.toml")
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	s := mustRead(t, path)
	if !reflect.DeepEqual(s.Channels, Demo().Channels) {
		t.Errorf("a byte order mark and carriage returns change the channels")
	}
}

func TestPositions(t *testing.T) {
	document := "a.b = 1\n" + // 1
		"[[channel]]\n" +
		"name = \"ü\"  # µ\n" + // 3
		"  [[channel.signal]]\n" +
		"  shape = { kind = \"x\", mean = 2 }\n" + // 5
		"[[channel]]\n" +
		"[[channel.signal]]\n" + // 7
		"[[channel.signal]]\n" +
		"list = [ 'µ', { x = 1 },\n  [ 4, 5 ] ]\n" + // 9, 10
		"[channel.other]\n" + // 11
		"y = 1\n"
	at := locate([]byte(document))
	for _, tt := range []struct {
		path         string
		line, column int
	}{
		{"a/b", 1, 3},
		{"channel/0", 2, 1},
		{"channel/0/name", 3, 1},
		{"channel/0/signal/0", 4, 3},
		{"channel/0/signal/0/shape", 5, 3},
		{"channel/0/signal/0/shape/mean", 5, 25},
		{"channel/1", 6, 1},
		{"channel/1/signal/1", 8, 1},
		{"channel/1/signal/1/list/0", 9, 10},
		{"channel/1/signal/1/list/1", 9, 15},
		{"channel/1/signal/1/list/1/x", 9, 17},
		{"channel/1/signal/1/list/2/0", 10, 5},
		{"channel/1/other/y", 12, 1},
	} {
		offset, known := at["\x00"+strings.ReplaceAll(tt.path, "/", "\x00")]
		if !known {
			t.Errorf("%v has no place", tt.path)
			continue
		}
		if line, column := lineColumn([]byte(document), offset); line != tt.line || column != tt.column {
			t.Errorf("%v is at %v:%v, want %v:%v", tt.path, line, column, tt.line, tt.column)
		}
	}
}

func TestNearest(t *testing.T) {
	// Distances counted by hand.
	for _, tt := range []struct {
		a, b string
		want int
	}{{"", "", 0}, {"rate", "rate", 0}, {"rate", "rat", 1}, {"size", "shift", 3}, {"", "mean", 4}, {"kitten", "sitting", 3}} {
		if got := editDistance(tt.a, tt.b); got != tt.want {
			t.Errorf("editDistance(%q, %q) = %v, want %v", tt.a, tt.b, got, tt.want)
		}
	}
	if got := nearest("backgruond", []string{"signal", "background"}); got != "background" {
		t.Errorf("nearest is %q, want background", got)
	}
	if got := nearest("zzz", []string{"signal", "background"}); got != "" {
		t.Errorf("nearest is %q, want none", got)
	}
}

func TestLuminosities(t *testing.T) {
	values := []float64{5, 1, 3}
	got, err := Luminosities(values)
	if err != nil || !reflect.DeepEqual(got, []float64{1, 3, 5}) || values[0] != 5 {
		t.Errorf("Luminosities = %v, %v, want 1, 3, 5, and the argument as it was: %v", got, err, values)
	}
	for _, bad := range [][]float64{nil, {0}, {-1}, {math.NaN()}, {math.Inf(1)}, {2, 1, 2}, make([]float64, 201)} {
		if got, err := Luminosities(bad); err == nil {
			t.Errorf("Luminosities(%v) = %v, want an error", bad, got)
		}
	}
	spaced, err := Spaced(0.5, 50, 5)
	if err != nil || len(spaced) != 5 || spaced[0] != 0.5 || spaced[4] != 50 {
		t.Fatalf("Spaced = %v, %v, want 5 from 0.5 to 50", spaced, err)
	}
	for i := 1; i < 5; i++ {
		if ratio := spaced[i] / spaced[i-1]; math.Abs(ratio-math.Sqrt(10)) > 1e-12 {
			t.Errorf("ratio %v is %v, want √10", i, ratio)
		}
	}
	for _, bad := range []struct {
		from, to float64
		points   int
	}{{0, 1, 5}, {2, 1, 5}, {1, 1, 5}, {1, math.Inf(1), 5}, {math.NaN(), 1, 5}, {1, math.NaN(), 5}, {1, 2, 1}, {1, 2, 201}} {
		if got, err := Spaced(bad.from, bad.to, bad.points); err == nil {
			t.Errorf("Spaced(%v) = %v, want an error", bad, got)
		}
	}
}

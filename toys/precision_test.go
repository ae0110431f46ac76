package toys

import (
	"context"
	"strings"
	"testing"
	"time"
)

// A run by precision reaches it, and says with how many toys the same comes
// again.
func TestPrecision(t *testing.T) {
	config := Config{WithoutExact: true, Luminosities: []float64{3}, Seed: 61, Precision: 0.03}
	r, err := Reach(context.Background(), onOff(10, 20, 2), config)
	if err != nil {
		t.Fatal(err)
	}
	if w := r.worst(); !(w > 0 && w <= 0.03) {
		t.Errorf("worst relative error is %v, want 0.03 or less", w)
	}
	if len(r.Notes) != 1 || !strings.Contains(r.Notes[0], "--toys ") {
		t.Errorf("notes are %q, want one that names the toys", r.Notes)
	}
	again, err := Reach(context.Background(), onOff(10, 20, 2), Config{WithoutExact: true, Luminosities: []float64{3}, Seed: 61, Toys: r.Config.Toys})
	if err != nil {
		t.Fatal(err)
	}
	if got, want := pointText(again.Points[0]), pointText(r.Points[0]); got != want {
		t.Errorf("with the toys it names:\n%s\nthe run by precision:\n%s", got, want)
	}
}

// A precision out of reach in the time gives what was reached, or an error if
// that is nothing.
func TestWithin(t *testing.T) {
	search := scenario(t, "combination")
	config := Config{Luminosities: []float64{1}, Seed: 67, Precision: 1e-4, Within: 10 * time.Microsecond}
	if _, err := Reach(context.Background(), search, config); err == nil || !strings.Contains(err.Error(), "too short") {
		t.Errorf("a time for nothing gives %v", err)
	}
	count := Config{WithoutExact: true, Luminosities: []float64{3}, Seed: 67, Precision: 1e-4, Within: 3 * time.Second}
	r, err := Bands(context.Background(), onOff(10, 20, 2), count)
	if err != nil {
		t.Fatal(err)
	}
	if len(r.Notes) != 1 || !strings.Contains(r.Notes[0], "time") || r.Config.Toys < firstToys {
		t.Errorf("notes %q with %d toys, want one of the time", r.Notes, r.Config.Toys)
	}
}

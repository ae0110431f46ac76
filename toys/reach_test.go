package toys

import (
	"context"
	"testing"
)

func TestReachSketch(t *testing.T) {
	r, err := Reach(context.Background(), onOff(0.9, 20, 3), Config{Luminosities: []float64{10, 100, 1000}, Toys: 5000, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range r.Points {
		t.Logf("%v\n %+v\n %+v", p.Luminosity, p.Formula, *p.Toys)
	}
	for _, g := range r.Goals {
		t.Logf("%v\n %+v\n %+v", g.Name, g.Formula, *g.Toys)
	}
	for _, c := range r.Cautions {
		t.Log(c)
	}
}

package toys

import (
	"fmt"
	"math"
	"testing"

	"lumireach/stats"
)

// benchmark scenarios: A a count with a control region, B a mass window, C four
// windows combined.
var benches = []struct{ name, file string }{{"A", "count"}, {"B", "window"}, {"C", "combination"}}

// BenchmarkToys is one toy: throwing it, the fits, its test statistic.
func BenchmarkToys(b *testing.B) {
	for _, s := range benches {
		e := engine(b, scenario(b, s.file), 1)
		for _, kind := range []struct {
			name string
			mu   float64
		}{{"null", 0}, {"signal", 1}} {
			b.Run(fmt.Sprintf("%s/%s-q0", s.name, kind.name), func(b *testing.B) {
				m := mixtureOf(b, []proposal{{Point: e.Point(kind.mu, nil), toys: tableDraws}})
				f := e.Fitter()
				stream := newStream()
				stream.restart(key{seed: 1})
				d := stats.Data{N: make([]float64, e.Bins()), A: make([]float64, e.Auxiliary())}
				b.ReportAllocs()
				for b.Loop() {
					m.throw(&d, 0, stream)
					if _, status := f.Q0(&d, kind.mu); status != stats.Converged {
						b.Fatal(status.Err())
					}
				}
				b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "toys/s")
			})
		}
		b.Run(s.name+"/null-qtilde", func(b *testing.B) {
			mu, err := e.ExpectedLimit(0, 0.95)
			if err != nil {
				b.Fatal(err)
			}
			m := mixtureOf(b, []proposal{{Point: e.Point(0, nil), toys: tableDraws}})
			f := e.Fitter()
			stream := newStream()
			stream.restart(key{seed: 1})
			d := stats.Data{N: make([]float64, e.Bins()), A: make([]float64, e.Auxiliary())}
			b.ReportAllocs()
			for b.Loop() {
				m.throw(&d, 0, stream)
				if _, status := f.QTilde(&d, mu, f.Free(&d, 0, math.Inf(1))); status != stats.Converged {
					b.Fatal(status.Err())
				}
			}
			b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "toys/s")
		})
	}
}

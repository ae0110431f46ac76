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
				w := testWorker(e, 1)
				b.ReportAllocs()
				for b.Loop() {
					m.throw(w, 0)
					if _, status := f.Q0(&w.data, kind.mu); status != stats.Converged {
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
			w := testWorker(e, 1)
			b.ReportAllocs()
			for b.Loop() {
				m.throw(w, 0)
				if _, status := f.QTilde(&w.data, mu, f.Free(&w.data, 0, math.Inf(1))); status != stats.Converged {
					b.Fatal(status.Err())
				}
			}
			b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "toys/s")
		})
	}
}

// BenchmarkTail reports how many weighted toys a tail takes to 5 %: 5σ alone, aimed
// at, and the worst of all from 1σ to 6σ.
func BenchmarkTail(b *testing.B) {
	const toys = 40000
	for _, s := range benches {
		e := engine(b, scenario(b, s.file), 1)
		for _, kind := range []struct {
			name   string
			wanted span
			tails  []float64
		}{{"5", span{4.75, 5.25}, []float64{5}}, {"1-6", span{1, 6}, []float64{1, 2, 3, 4, 5, 6}}} {
			b.Run(s.name+"/"+kind.name, func(b *testing.B) {
				worst := 0.0
				seed := uint64(0)
				runs := 0.0
				for b.Loop() {
					seed++
					r := testRunner(b, Config{Toys: toys, Seed: seed})
					null, err := r.nullOnce(e, 1, kind.wanted, toys, 1)
					if err != nil {
						b.Fatal(err)
					}
					most := 0.0
					for _, z := range kind.tails {
						p := null.p(z * z)
						most = math.Max(most, math.Pow(p.err/p.p/0.05, 2)*float64(null.total))
					}
					worst += most
					runs++
				}
				b.ReportMetric(worst/runs, "toys-to-5%")
			})
		}
	}
}

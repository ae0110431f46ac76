package physics

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// movedBy makes a template that pairs of templates up and down move.
func movedBy(nominal []float64, pairs ...[2][]float64) movingTemplate {
	s := moving(newTemplate(nominal))
	for _, pair := range pairs {
		up, down := newTemplate(pair[0]).(template), newTemplate(pair[1]).(template)
		s.moves = append(s.moves, newTemplateMove(s.nominal, up.fractions, down.fractions))
	}
	return s
}

// TestMovingTemplateFractions compares with products of powers of the ratios.
// With g(x) = |x| beyond ±1 they are up^x and down^-x there, and up^((g+x)/2) ·
// down^((g-x)/2) within, where g(½) = (3/4 - 1/16)/2 = 11/32 by hand.
func TestMovingTemplateFractions(t *testing.T) {
	nominal := []float64{40, 30, 0, 20, 10}
	up1, down1 := []float64{60, 20, 7, 15, 5}, []float64{30, 30, 0, 20, 20}
	up2, down2 := []float64{1, 1, 0, 1, 1}, []float64{9, 5, 1, 4, 3}
	s := movedBy(nominal, [2][]float64{up1, down1}, [2][]float64{up2, down2})
	for _, tt := range []struct {
		name       string
		q          []float64
		u1, d1     float64 // powers of the ratios of each pair
		u2, d2     float64
		normalised []float64 // events that give the same, nil if none do
	}{
		{"nominal", []float64{0, 0}, 0, 0, 0, 0, nominal},
		{"first up", []float64{1, 0}, 1, 0, 0, 0, []float64{60, 20, 0, 15, 5}},
		{"first down", []float64{-1, 0}, 0, 1, 0, 0, []float64{30, 30, 0, 20, 20}},
		{"second up", []float64{0, 1}, 0, 0, 1, 0, []float64{1, 1, 0, 1, 1}},
		{"second down", []float64{0, -1}, 0, 0, 0, 1, []float64{9, 5, 0, 4, 3}},
		{"three up", []float64{3, 0}, 3, 0, 0, 0, nil},
		{"two down", []float64{-2, 0}, 0, 2, 0, 0, nil},
		{"both", []float64{1, -2}, 1, 0, 0, 2, nil},
		{"half up", []float64{0.5, 0}, 27. / 64, -5. / 64, 0, 0, nil},
		{"half down", []float64{0, -0.5}, 0, 0, -5. / 64, 27. / 64, nil},
	} {
		t.Run(tt.name, func(t *testing.T) {
			want := tt.normalised
			if want == nil {
				want = make([]float64, 5)
				for i, n := range nominal {
					if n > 0 { // sums of the files: 100; 107 and 100; 4 and 22
						want[i] = n * math.Pow(up1[i]/n*100/107, tt.u1) * math.Pow(down1[i]/n, tt.d1) *
							math.Pow(up2[i]/n*100/4, tt.u2) * math.Pow(down2[i]/n*100/22, tt.d2)
					}
				}
			}
			sum := 0.0
			for _, v := range want {
				sum += v
			}
			f := make([]float64, 5)
			s.Fill(tt.q, f, nil, nil)
			for i, v := range want {
				if math.Abs(f[i]-v/sum) > 1e-14 {
					t.Errorf("bin %v holds %v, want %v", i, f[i], v/sum)
				}
			}
		})
	}
}

// TestMovingTemplateFar: where one bin takes everything no fraction is lost to
// overflow, and beyond all numbers the shape does not exist.
func TestMovingTemplateFar(t *testing.T) {
	s := movedBy([]float64{1e-300, 1, 0}, [2][]float64{{1, 1, 0}, {1e-300, 1, 0}})
	f := make([]float64, 3)
	s.Fill([]float64{1000}, f, nil, nil)
	if f[0] != 1 || f[1] != 0 || f[2] != 0 {
		t.Errorf("far up the fractions are %v, want 1, 0, 0", f)
	}
	for _, q := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		d1, d2 := make([]float64, 3), make([]float64, 3)
		s.Fill([]float64{q}, f, d1, d2)
		for i := range f {
			if !math.IsNaN(f[i]) || !math.IsNaN(d1[i]) || !math.IsNaN(d2[i]) {
				t.Errorf("at %v bin %v holds %v, %v, %v, want NaN", q, i, f[i], d1[i], d2[i])
			}
		}
	}
}

func TestMovingTemplateDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		bins := rapid.IntRange(1, 30).Draw(t, "bins")
		draw := func(name string, least float64) []float64 {
			return rapid.SliceOfN(rapid.Float64Range(least, 10), bins, bins).Draw(t, name)
		}
		nominal := draw("nominal", 0.1)
		if bins > 1 && rapid.Bool().Draw(t, "empty bin") {
			nominal[0] = 0
		}
		var pairs [][2][]float64
		var q, unit []float64
		for range rapid.IntRange(1, 3).Draw(t, "uncertainties") {
			pairs = append(pairs, [2][]float64{draw("up", 0.1), draw("down", 0.1)})
			// Steps of differences stay on one side of ±1, where the curvature jumps.
			x := rapid.SampledFrom([]float64{-2.5, -1.01, -0.99, -0.4, 0, 0.3, 0.98, 1.02, 3}).Draw(t, "quantity")
			q, unit = append(q, x), append(unit, 1)
		}
		checkDerivatives(t, movedBy(nominal, pairs...), bins, q, unit)
	})
}

// TestMovingTemplateAtTheJump holds the curvature at ±1 to that of the outer
// side, the fractions and slopes to both.
func TestMovingTemplateAtTheJump(t *testing.T) {
	s := movedBy([]float64{4, 3, 2}, [2][]float64{{6, 3, 1}, {5, 3, 2}})
	fill := func(q float64) [3][]float64 {
		out := [3][]float64{make([]float64, 3), make([]float64, 3), make([]float64, 3)}
		s.Fill([]float64{q}, out[0], out[1], out[2])
		return out
	}
	for _, side := range []float64{1, -1} {
		at, outer, inner := fill(side), fill(side*(1+1e-9)), fill(side*(1-1e-9))
		for i := range 3 {
			for order := range 2 {
				if math.Abs(at[order][i]-outer[order][i]) > 1e-8 || math.Abs(at[order][i]-inner[order][i]) > 1e-8 {
					t.Errorf("at %v, derivative %v of bin %v jumps: %v, %v, %v", side, order, i, inner[order][i], at[order][i], outer[order][i])
				}
			}
			if math.Abs(at[2][i]-outer[2][i]) > 1e-8 || math.Abs(at[2][i]-inner[2][i]) < 1e-2 {
				t.Errorf("at %v the curvature of bin %v is %v, want %v of the outer side, not %v", side, i, at[2][i], outer[2][i], inner[2][i])
			}
		}
	}
}

func TestMovingTemplateFillDoesNotAllocate(t *testing.T) {
	flat := firstBinOnly(60)
	for i := range flat {
		flat[i]++
	}
	s := movedBy(flat, [2][]float64{flat, flat}, [2][]float64{flat, flat})
	q, f, d1, d2 := []float64{0.3, -2}, make([]float64, 60), make([]float64, 120), make([]float64, 180)
	if n := testing.AllocsPerRun(100, func() { s.Fill(q, f, d1, d2) }); n != 0 {
		t.Errorf("Fill allocates %v times, want 0", n)
	}
	defer func() {
		if recover() != wrongBins {
			t.Errorf("Fill of 59 bins did not panic with %q", wrongBins)
		}
	}()
	s.Fill(q, f[:59], nil, nil)
}

package physics

import "math"

const (
	// farthest is where a normal tail reaches 1e-307, the last that is still a
	// normal number; beyond it counts as empty.
	farthest = 37.5
	// millsSteps is the number of table points per standard deviation.
	millsSteps = 32
	// millsTerms keeps the first omitted Taylor term below 1e-16 at half a step.
	// Eight coefficients also fill one line of a cache.
	millsTerms = 8
)

// millsTable holds the Taylor coefficients of the Mills ratio at multiples of
// a step, for the distance in steps.
var millsTable = makeMillsTable()

// makeMillsTable starts from erfc and continues with the derivatives
// M' = zM - 1, M^(n+1) = z M^(n) + n M^(n-1), from differentiating the ratio
// (DLMF section 7.8). The rounding error of a derivative grows by z from one to
// the next, and its term shrinks by n·2·millsSteps, so that no term is less
// exact than the first.
func makeMillsTable() (table [farthest*millsSteps + 2][millsTerms]float64) {
	for k := range table {
		z := float64(k) / millsSteps
		derivative := [millsTerms]float64{0: 0.5 * math.Erfc(z/math.Sqrt2) / normalDensity(z)}
		derivative[1] = z*derivative[0] - 1
		for n := 1; n+1 < millsTerms; n++ {
			derivative[n+1] = z*derivative[n] + float64(n)*derivative[n-1]
		}
		scale := 1.0 // of the step to the n, over n!
		for n, d := range derivative {
			table[k][n] = d * scale
			scale /= millsSteps * float64(n+1)
		}
	}
	return table
}

func normalDensity(z float64) float64 {
	const normalisation = 0.398942280401432677939946059934381868 // 1/√(2π)
	return normalisation * math.Exp(-0.5*z*z)
}

// mills returns the upper tail of the unit normal over its density, at the
// distance of that many steps from the mean, from 0 to farthest. It is short
// enough to be inlined, which counts.
func mills(steps float64) float64 {
	k := int(steps + 0.5)
	c := &millsTable[k]
	t := steps - float64(k)
	return c[0] + t*(c[1]+t*(c[2]+t*(c[3]+t*(c[4]+t*(c[5]+t*(c[6]+t*c[7]))))))
}

package toys

import "math"

// checkedAt are the thresholds of the check of weights.
var checkedAt = [2]float64{2, 3}

// suspicious is the pull of a check that is told: right weights reach it in one
// run of 15000, of a normal pull.
const suspicious = 4

// check adds one tail's plain toys, those of its first component, to the checks.
func (r *runner) check(t *tail) {
	if len(t.thrown) < 2 {
		return
	}
	for k, z := range checkedAt {
		c := &r.checks[k]
		n := t.within(z * z)
		passing := 0
		for _, toy := range t.toys[:n] {
			if toy.component == 0 {
				passing++
			}
		}
		c.Z = z
		c.Plain += t.thrown[0]
		c.Passing += passing
		c.Expected += t.first(n).p * float64(t.thrown[0])
		c.Pull = (float64(c.Passing) - c.Expected) / math.Sqrt(math.Max(c.Expected, 1))
	}
}

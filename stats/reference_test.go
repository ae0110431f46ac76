package stats

import (
	"encoding/csv"
	"math"
	"os"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// published is one row of testdata/reference/published.csv: a value as printed
// in its source, and the same recomputed with more digits. Rows known from
// memory were not read in the source; they are recomputed and agree.
type published struct {
	id, source, known string
	input             map[string]float64
	printed           []string
	recomputed        []string
}

// rowsOf reads the rows whose id begins with a prefix.
func rowsOf(t *testing.T, prefix string) []published {
	t.Helper()
	file, err := os.Open("../testdata/reference/published.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	records, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	pair := regexp.MustCompile(`([A-Za-z_]+|sigma_b/b)=([-+0-9.e]+)`)
	split := func(s string) []string {
		if s == "" {
			return nil
		}
		return strings.Split(strings.ReplaceAll(s, " ", ""), ";")
	}
	var rows []published
	for _, r := range records[1:] {
		if !strings.HasPrefix(r[0], prefix) {
			continue
		}
		p := published{id: r[0], printed: split(r[3]), recomputed: split(r[4]), source: r[5], known: r[6], input: map[string]float64{}}
		for _, m := range pair.FindAllStringSubmatch(r[2], -1) {
			p.input[m[1]], _ = strconv.ParseFloat(m[2], 64)
		}
		rows = append(rows, p)
	}
	if len(rows) == 0 {
		t.Fatalf("no reference row %q", prefix)
	}
	return rows
}

// agrees compares with the printed value to half a unit of its last digit, and
// with the recomputed one to half a unit of its own.
func (p published) agrees(t *testing.T, k int, got float64) {
	t.Helper()
	for name, list := range map[string][]string{"printed": p.printed, "recomputed": p.recomputed} {
		if k >= len(list) {
			continue
		}
		want, err := strconv.ParseFloat(list[k], 64)
		if err != nil {
			t.Fatalf("%s: %v", p.id, err)
		}
		if half := lastDigit(list[k]) * 0.5001; !(math.Abs(got-want) <= half) {
			t.Errorf("%s: %v, %s value is %v ± %v (%s; %s)", p.id, got, name, want, half, p.source, p.known)
		}
	}
}

// lastDigit is one unit of the last digit of a printed number, at least a
// millionth of it: six digits are kept of recomputed values.
func lastDigit(s string) float64 {
	mantissa, exponent, _ := strings.Cut(s, "e")
	e, _ := strconv.Atoi(exponent)
	if _, decimals, ok := strings.Cut(mantissa, "."); ok {
		e -= len(decimals)
	}
	v, _ := strconv.ParseFloat(s, 64)
	return math.Max(math.Pow(10, float64(e)), 2e-6*math.Abs(v))
}

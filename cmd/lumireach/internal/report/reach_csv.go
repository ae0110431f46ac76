package report

import (
	"encoding/csv"
	"io"
	"math"
	"strconv"

	"lumireach/toys"
)

// ReachCSV writes one row for each luminosity and engine, under the JSON's names
// joined by dots. An empty field has no number.
func ReachCSV(w io.Writer, _ Header, r *toys.ReachResult) error {
	c := csv.NewWriter(w)
	header := []string{"luminosity", "engine"}
	for _, name := range []string{"discovery.z", "discovery.z_error", "discovery.z_at_least", "exclusion.mu_up", "exclusion.mu_up_error", "exclusion.mu_up_other"} {
		header = append(header, bandNames(name)...)
	}
	header = append(header, "discovery.chance_3", "discovery.chance_3_error", "discovery.chance_5", "discovery.chance_5_error",
		"discovery.chance_of_one_event", "discovery.toys", "discovery.failed_fits", "exclusion.toys", "exclusion.failed_fits",
		"discovery.why", "discovery.chance_why", "exclusion.why")
	c.Write(header)
	for _, p := range r.Points {
		c.Write(csvRow(p.Luminosity, "asymptotic", p.Formula, false))
		if p.Toys != nil {
			c.Write(csvRow(p.Luminosity, "toys", *p.Toys, true))
		}
		if p.Exact != nil {
			c.Write(csvRow(p.Luminosity, "exact", p.Exact.Answer, false))
		}
	}
	c.Flush()
	return c.Error()
}

func bandNames(name string) []string {
	return []string{name + ".minus2", name + ".minus1", name + ".median", name + ".plus1", name + ".plus2"}
}

func bandFields(b toys.Band, present bool) []string {
	l := list(b)
	return fields(present, l[:]...)
}

// fields are numbers unrounded, empty where there is none.
func fields(present bool, values ...float64) []string {
	out := make([]string, len(values))
	for k, v := range values {
		if present && !math.IsNaN(v) && !math.IsInf(v, 0) {
			out[k] = strconv.FormatFloat(v, 'g', -1, 64)
		}
	}
	return out
}

func csvRow(luminosity float64, engine string, a toys.Answer, thrown bool) []string {
	d, x := a.Discovery, a.Exclusion
	row := append(fields(true, luminosity), engine)
	row = append(row, bandFields(d.Z, true)...)
	row = append(row, bandFields(errorsOf(d.Z, d.ZError), thrown)...)
	row = append(row, bandFields(d.ZAtLeast, true)...)
	row = append(row, exclusionFields(x, thrown)...)
	row = append(row, fields(true, d.Chance3)...)
	row = append(row, fields(thrown, errorOf(d.Chance3, d.Chance3Error))...)
	row = append(row, fields(true, d.Chance5)...)
	row = append(row, fields(thrown, errorOf(d.Chance5, d.Chance5Error))...)
	row = append(row, fields(true, d.ChanceOne)...)
	row = append(row, fields(thrown, float64(d.Toys), float64(d.FailedFits), float64(x.Toys), float64(x.FailedFits))...)
	return append(row, d.Why, d.ChanceWhy, x.Why)
}

func exclusionFields(x toys.Exclusion, thrown bool) []string {
	row := append(bandFields(x.MuUp, true), bandFields(errorsOf(x.MuUp, x.MuUpError), thrown)...)
	return append(row, bandFields(x.MuUpOther, true)...)
}

package report

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"lumireach/toys"
)

func decodeReach(t *testing.T, r *toys.ReachResult) map[string]any {
	t.Helper()
	var b bytes.Buffer
	if err := ReachJSON(&b, header("reach"), r); err != nil {
		t.Fatal(err)
	}
	var out map[string]any
	if err := json.Unmarshal(b.Bytes(), &out); err != nil {
		t.Fatal(err)
	}
	return out
}

// at follows a dotted path; [] takes every element of a list.
func at(v any, path string) ([]any, error) {
	found := []any{v}
	for step := range strings.SplitSeq(path, ".") {
		key, each := strings.CutSuffix(step, "[]")
		var next []any
		for _, v := range found {
			object, ok := v.(map[string]any)
			if !ok {
				return nil, fmt.Errorf("%s: %v is no object", path, v)
			}
			value, ok := object[key]
			if !ok {
				return nil, fmt.Errorf("%s: no %q", path, key)
			}
			if !each {
				next = append(next, value)
				continue
			}
			list, ok := value.([]any)
			if !ok || len(list) == 0 {
				return nil, fmt.Errorf("%s: %q is %v, want a list with elements", path, key, value)
			}
			next = append(next, list...)
		}
		found = next
	}
	return found, nil
}

func bandPaths(path string) []string { return bandNames(path) }

// TestReachFormat1 holds the JSON to the fields of format 1, with their types.
func TestReachFormat1(t *testing.T) {
	full := decodeReach(t, fullReach())
	for path, want := range map[string]any{
		"format": 1.0, "command": "reach", "version": "1.2.3",
		"scenario.title": "Slow pairs in the Tarnvik cellar", "scenario.source": "pairs/cellar.toml",
		"scenario.sha256": header("").SHA256, "scenario.luminosity_unit": "kg·d",
		"settings.seed": 7.0, "settings.toys": 5000.0, "settings.mu": 1.5, "settings.confidence": 0.95, "settings.nuisances": "fixed",
	} {
		if got, err := at(full, path); err != nil || got[0] != want {
			t.Errorf("%s = %v, want %v (%v)", path, got, want, err)
		}
	}

	numbers := []string{"points[].luminosity", "goals[].asymptotic.luminosity"}
	const discovery, exclusion, goals = "points[].discovery.", "points[].exclusion.", "goals[]."
	for _, engine := range []string{"asymptotic", "toys"} {
		numbers = append(numbers, bandPaths(discovery+engine+".z")...)
		numbers = append(numbers, discovery+engine+".chance_3", discovery+engine+".chance_5")
		numbers = append(numbers, bandPaths(exclusion+engine+".mu_up")...)
		numbers = append(numbers, goals+engine+".luminosity", goals+engine+".luminosity_80", goals+engine+".luminosity_90")
	}
	numbers = append(numbers, bandPaths(discovery+"toys.z_error")...)
	numbers = append(numbers, bandPaths(exclusion+"toys.mu_up_error")...)
	for _, field := range []string{"chance_3_error", "chance_5_error", "toys", "failed_fits", "tail.reaches_z", "tail.effective_toys", "tail.largest_share"} {
		numbers = append(numbers, discovery+"toys."+field)
	}
	numbers = append(numbers, exclusion+"toys.toys", exclusion+"toys.failed_fits",
		goals+"toys.error", goals+"toys.error_80", goals+"toys.error_90")
	for _, path := range numbers {
		got, err := at(full, path)
		if err != nil {
			t.Error(err)
		}
		for _, v := range got {
			if _, ok := v.(float64); !ok {
				t.Errorf("%s = %v, want a number", path, v)
			}
		}
	}
	for path, want := range map[string][]any{
		"goals[].goal":                   {"evidence", "discovery", "exclusion"},
		"goals[].asymptotic.beyond_list": {false, true, true},
		"goals[].toys.beyond_list":       {false, true, true},
		"goals[].asymptotic.plateau":     {nil, nil, nil},
		"cautions[]":                     {cautions[0], cautions[1]},
	} {
		if got, err := at(full, path); err != nil || !slices.Equal(got, want) {
			t.Errorf("%s = %v, want %v (%v)", path, got, want, err)
		}
	}
	goal := full["goals"].([]any)
	for i, want := range []string{"z:3", "z:5", "confidence:0.95"} {
		key, value, _ := strings.Cut(want, ":")
		if got := fmt.Sprint(goal[i].(map[string]any)[key]); got != value {
			t.Errorf("goals[%d].%s = %v, want %v", i, key, got, value)
		}
	}

	formulas := decodeReach(t, formulasOnly())
	for _, path := range []string{"points[].discovery", "points[].exclusion", "goals[]"} {
		objects, err := at(formulas, path)
		if err != nil {
			t.Fatal(err)
		}
		for _, o := range objects {
			if toys, ok := o.(map[string]any)["toys"]; ok {
				t.Errorf("formulas only: %s.toys = %v, want it absent", path, toys)
			}
		}
	}
	if got, err := at(formulas, "goals[].asymptotic.plateau"); err != nil || !slices.Equal(got, []any{nil, 4.2, nil}) {
		t.Errorf("plateaus = %v, want [null 4.2 null] (%v)", got, err)
	}
}

// reasons names the field that must say why a null stands in another. A plateau
// is null wherever a goal is reached.
var reasons = map[string]string{
	"z": "why", "z_error": "why", "chance_3": "chance_why", "chance_3_error": "chance_why",
	"chance_5": "chance_why", "chance_5_error": "chance_why", "mu_up": "why", "mu_up_error": "why",
	"luminosity": "why", "error": "why", "luminosity_80": "why_80", "error_80": "why_80",
	"luminosity_90": "why_90", "error_90": "why_90",
	"first": "why", "always_after": "why", "first_80": "why_80", "always_after_80": "why_80",
	"first_90": "why_90", "always_after_90": "why_90",
}

// checkNulls finds nulls, alone or in a band, and asks for the reason beside.
func checkNulls(t *testing.T, path string, v any) (nulls int) {
	t.Helper()
	switch v := v.(type) {
	case []any:
		for i, element := range v {
			nulls += checkNulls(t, fmt.Sprintf("%s[%d]", path, i), element)
		}
	case map[string]any:
		for key, value := range v {
			empty := value == nil
			if band, ok := value.(map[string]any); ok {
				for _, q := range band {
					empty = empty || q == nil
				}
				if _, isBand := band["median"]; !isBand {
					nulls += checkNulls(t, path+"."+key, value)
					continue
				}
			}
			if !empty {
				nulls += checkNulls(t, path+"."+key, value)
				continue
			}
			if key == "plateau" {
				continue
			}
			nulls++
			if why, ok := v[reasons[key]].(string); !ok || why == "" {
				t.Errorf("%s.%s has a null and no %q beside it: %v", path, key, reasons[key], value)
			}
		}
	}
	return nulls
}

func TestNullHasWhy(t *testing.T) {
	want := map[string]int{"full": 0, "exact": 6, "formulas": 3, "gaps": 29}
	for name, r := range reaches() {
		if got := checkNulls(t, name, decodeReach(t, r)); got != want[name] {
			t.Errorf("%s has %d fields with a null, want %d", name, got, want[name])
		}
	}
	for name, r := range bands() {
		var b bytes.Buffer
		if err := BandsJSON(&b, header("bands"), r); err != nil {
			t.Fatal(err)
		}
		var out map[string]any
		if err := json.Unmarshal(b.Bytes(), &out); err != nil {
			t.Fatal(err)
		}
		checkNulls(t, "bands "+name, out)
	}
	var b bytes.Buffer
	if err := YieldsJSON(&b, header("yields"), expectedYields()); err != nil {
		t.Fatal(err)
	}
	if strings.Contains(b.String(), "null") {
		t.Errorf("yields have a null, want what has no number to be absent:\n%s", b.String())
	}
}

// TestNoNaN looks at every output for a number that is none.
func TestNoNaN(t *testing.T) {
	for name, r := range reaches() {
		r.Points[0].Formula.Discovery.Z.Plus2 = math.Inf(1)
		r.Points[0].Formula.Exclusion.MuUp.Plus2 = math.Inf(-1)
		var b bytes.Buffer
		for _, err := range []error{ReachTable(&b, header("reach"), r), ReachJSON(&b, header("reach"), r), ReachCSV(&b, header("reach"), r)} {
			if err != nil {
				t.Fatal(err)
			}
		}
		for _, bad := range []string{"NaN", "Inf", "nan", "%!"} {
			if i := strings.Index(b.String(), bad); i >= 0 {
				t.Errorf("%s: the output has %q in it: %q", name, bad, b.String()[max(0, i-40):i+len(bad)])
			}
		}
	}
}

// TestUnrounded reads JSON and CSV back to the very numbers of the result, the
// hardest ones of a float64 among them, and finds CSV and JSON to agree.
func TestUnrounded(t *testing.T) {
	r := fullReach()
	hard := []float64{math.Nextafter(1, 2), 0.1 + 0.2, 5e-324, math.MaxFloat64, 123456789.123456789}
	r.Points[1].Toys.Discovery.Z = toys.Band{Minus2: hard[0], Minus1: hard[1], Median: hard[2], Plus1: hard[3], Plus2: hard[4]}
	out := decodeReach(t, r)
	var b bytes.Buffer
	if err := ReachCSV(&b, header("reach"), r); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(&b).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 1+2*len(r.Points) {
		t.Fatalf("CSV has %d rows, want a header and two of each point", len(rows))
	}
	for i, path := range bandPaths("z") {
		got, err := at(out, "points[].discovery.toys."+path)
		if err != nil {
			t.Fatal(err)
		}
		if got[1] != hard[i] {
			t.Errorf("JSON %s = %v, want %v", path, got[1], hard[i])
		}
	}
	for column, name := range rows[0] {
		if name == "luminosity" || name == "engine" || strings.HasSuffix(name, "why") ||
			strings.Contains(name, "at_least") || strings.Contains(name, "other") || strings.Contains(name, "one_event") {
			continue // not in this result
		}
		quantity, field, _ := strings.Cut(name, ".")
		want, err := at(out, "points[]."+quantity+".toys."+field)
		if err != nil {
			t.Errorf("CSV column %s is not in the JSON: %v", name, err)
			continue
		}
		for point := range r.Points {
			if got, err := strconv.ParseFloat(rows[2+2*point][column], 64); err != nil || got != want[point] {
				t.Errorf("CSV %s of point %d = %v, JSON has %v", name, point, rows[2+2*point][column], want[point])
			}
		}
	}
}

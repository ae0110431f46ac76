package physics

import (
	"errors"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var refresh = flag.Bool("refresh", false, "write the errors of testdata/bad anew")

// TestBadScenarios holds every refusal to its line, word by word: NAME.err
// beside NAME.toml, with the directory left out.
func TestBadScenarios(t *testing.T) {
	directory := filepath.Join("..", "testdata", "bad")
	scenarios, err := filepath.Glob(filepath.Join(directory, "*.toml"))
	if err != nil || len(scenarios) < 30 {
		t.Fatalf("%v bad scenarios in %v (%v), want at least 30", len(scenarios), directory, err)
	}
	for _, path := range scenarios {
		name := strings.TrimSuffix(filepath.Base(path), ".toml")
		t.Run(name, func(t *testing.T) {
			s, err := Read(path)
			if err == nil {
				t.Fatalf("Read(%v) = %+v, want an error", path, s)
			}
			var typed *Error
			if !errors.As(err, &typed) || typed.Line < 1 || typed.Column < 1 {
				t.Errorf("Read(%v): %#v, want an *Error with line and column", path, err)
			}
			got := strings.TrimPrefix(err.Error(), directory+string(filepath.Separator)) + "\n"
			if strings.Count(got, "\n") != 1 {
				t.Errorf("Read(%v): %q, want one line", path, got)
			}
			golden := strings.TrimSuffix(path, ".toml") + ".err"
			if *refresh {
				if err := os.WriteFile(golden, []byte(got), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(golden)
			if err != nil {
				t.Fatal(err)
			}
			if got != string(want) {
				t.Errorf("Read(%v)\n got %v\nwant %v", path, got, string(want))
			}
		})
	}
}

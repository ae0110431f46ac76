package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// refused runs the program where it must refuse, and returns what it says.
func refused(t *testing.T, args ...string) string {
	t.Helper()
	var stdout, stderr bytes.Buffer
	if status := run(t.Context(), append([]string{"lumireach"}, args...), &stdout, &stderr); status != statusUsage {
		t.Errorf("%v: status %d, want %d", args, status, statusUsage)
	}
	if stdout.Len() > 0 {
		t.Errorf("%v: standard output is %q, want nothing", args, stdout.String())
	}
	if !oneError(stderr.String()) {
		t.Errorf("%v: standard error is %q, want one line, lumireach: …", args, stderr.String())
	}
	return strings.TrimPrefix(stderr.String(), "lumireach: ")
}

// TestBadScenarios wants each command to refuse every file of testdata/bad with
// the line beside it in NAME.err.
func TestBadScenarios(t *testing.T) {
	t.Chdir(filepath.Join("..", "..", "testdata", "bad"))
	scenarios, err := filepath.Glob("*.toml")
	if err != nil || len(scenarios) < 30 {
		t.Fatalf("%d bad scenarios (%v), want at least 30", len(scenarios), err)
	}
	for _, path := range scenarios {
		t.Run(path, func(t *testing.T) {
			want, err := os.ReadFile(strings.TrimSuffix(path, ".toml") + ".err")
			if err != nil {
				t.Fatal(err)
			}
			for _, command := range []string{"reach", "bands", "yields"} {
				if got := refused(t, command, path); got != string(want) {
					t.Errorf("%s %s\n got %s\nwant %s", command, path, got, want)
				}
			}
		})
	}
}

func TestNoScenario(t *testing.T) {
	t.Chdir(t.TempDir())
	if err := os.Mkdir("directory.toml", 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("empty.toml", nil, 0o644); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct{ name, path, want string }{
		{"directory", "directory.toml", "directory.toml: is a directory, must be a file\n"},
		{"missing", "missing.toml", "missing.toml: no such file\n"},
		{"empty", "empty.toml", "empty.toml:1:1: the scenario is empty: it wants [luminosity] and at least one [[channel]]\n"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			for _, command := range []string{"reach", "bands", "yields"} {
				if got := refused(t, command, tt.path); got != tt.want {
					t.Errorf("%s %s: %q, want %q", command, tt.path, got, tt.want)
				}
			}
		})
	}
}

package main

import (
	"errors"
	"io"
	"os"
	"testing"
)

// TestReplace fails in the middle of a write, and finds the file as it was.
func TestReplace(t *testing.T) {
	t.Chdir(t.TempDir())
	const before, after = "what stood here before\n", "what stands here now\n"
	if err := os.WriteFile("kept.txt", []byte(before), 0o644); err != nil {
		t.Fatal(err)
	}
	holds := func(want string) {
		t.Helper()
		if got, err := os.ReadFile("kept.txt"); err != nil || string(got) != want {
			t.Errorf("the file holds %q (%v), want %q", got, err, want)
		}
		files, err := os.ReadDir(".")
		if err != nil {
			t.Fatal(err)
		}
		if len(files) != 1 {
			t.Errorf("files %v, want kept.txt alone", files)
		}
	}
	broken := errors.New("no number")
	for _, path := range []string{"kept.txt", "new.txt"} {
		err := replace(path, func(w io.Writer) error {
			if _, err := io.WriteString(w, after); err != nil {
				return err
			}
			if got, err := os.ReadFile("kept.txt"); err != nil || string(got) != before {
				t.Errorf("during the write the file holds %q (%v), want %q", got, err, before)
			}
			return broken
		})
		if !errors.Is(err, broken) {
			t.Errorf("replace(%q) = %v, want %v", path, err, broken)
		}
		holds(before)
	}
	if err := replace("kept.txt", func(w io.Writer) error { _, err := io.WriteString(w, after); return err }); err != nil {
		t.Fatal(err)
	}
	holds(after)
}

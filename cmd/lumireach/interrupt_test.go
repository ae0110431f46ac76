package main

import (
	"bufio"
	"bytes"
	"context"
	"io"
	"os"
	"os/exec"
	"strings"
	"testing"
)

// cancelling ends a run at the first text on standard error, the note that the
// demonstration begins.
type cancelling struct {
	bytes.Buffer
	cancel context.CancelFunc
}

func (c *cancelling) Write(p []byte) (int, error) {
	c.cancel()
	return c.Buffer.Write(p)
}

const interruption = "lumireach: interrupted, nothing was written\n"

// TestInterrupted cancels runs that have begun and would take seconds.
func TestInterrupted(t *testing.T) {
	for _, tt := range []struct {
		name string
		args []string
	}{
		{"no arguments", nil},
		{"reach", []string{"reach", "--format", "json"}},
		{"bands", []string{"bands"}},
		{"precision", []string{"reach", "--precision", "0.0001", "--within", "20s"}},
		{"to a file", []string{"reach", "--out", "kept.txt"}},
		{"to a new file", []string{"bands", "--format", "json", "--out", "new.json"}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			t.Chdir(t.TempDir())
			const before = "what stood here before\n"
			if err := os.WriteFile("kept.txt", []byte(before), 0o644); err != nil {
				t.Fatal(err)
			}
			ctx, cancel := context.WithCancel(t.Context())
			defer cancel()
			stderr := &cancelling{cancel: cancel}
			var stdout bytes.Buffer
			status := run(ctx, append([]string{"lumireach"}, tt.args...), &stdout, stderr)
			if status != statusInterrupted {
				t.Errorf("status %d, want %d", status, statusInterrupted)
			}
			if stdout.Len() > 0 {
				t.Errorf("standard output is %q, want nothing", stdout.String())
			}
			if note, last, _ := strings.Cut(stderr.String(), "\n"); !strings.Contains(note, "demonstration") || last != interruption {
				t.Errorf("standard error is %q, want the note and %q", stderr.String(), interruption)
			}
			if after, err := os.ReadFile("kept.txt"); err != nil || string(after) != before {
				t.Errorf("the file now holds %q (%v), want %q", after, err, before)
			}
			files, err := os.ReadDir(".")
			if err != nil {
				t.Fatal(err)
			}
			if len(files) != 1 {
				t.Errorf("files %v, want kept.txt alone", files)
			}
		})
	}
}

// TestSignal interrupts the program itself.
func TestSignal(t *testing.T) {
	program := exec.CommandContext(t.Context(), "lumireach")
	var stdout bytes.Buffer
	program.Stdout = &stdout
	stderr, err := program.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := program.Start(); err != nil {
		t.Fatal(err)
	}
	lines := bufio.NewReader(stderr)
	if note, err := lines.ReadString('\n'); err != nil || !strings.Contains(note, "demonstration") {
		t.Errorf("standard error begins with %q (%v), want the note", note, err)
	}
	if err := program.Process.Signal(os.Interrupt); err != nil {
		t.Fatal(err)
	}
	rest, err := io.ReadAll(lines)
	if err != nil || string(rest) != interruption {
		t.Errorf("standard error ends with %q (%v), want %q", rest, err, interruption)
	}
	if err := program.Wait(); program.ProcessState.ExitCode() != statusInterrupted {
		t.Errorf("the program ends with %v, want exit status %d", err, statusInterrupted)
	}
	if stdout.Len() > 0 {
		t.Errorf("standard output is %q, want nothing", stdout.String())
	}
}

package main

import (
	"bytes"
	"errors"
	"strings"
	"testing"
)

// full takes so many bytes and then fails, as a disk does.
type full struct{ room int }

func (f *full) Write(p []byte) (int, error) {
	if len(p) <= f.room {
		f.room -= len(p)
		return len(p), nil
	}
	n := f.room
	f.room = 0
	return n, errors.New("no space left")
}

// TestFullOutput wants no result that was cut short to pass for a whole one.
func TestFullOutput(t *testing.T) {
	for _, command := range []string{
		"reach --toys 0 --quiet", "reach --toys 0 --quiet --format json", "reach --toys 0 --quiet --format csv",
		"bands --toys 0 --quiet", "bands --toys 0 --quiet --format json", "bands --toys 0 --quiet --format csv",
		"yields --quiet", "yields --quiet --format json", "yields --print-demo",
	} {
		args := append([]string{"lumireach"}, strings.Fields(command)...)
		var whole bytes.Buffer
		if status := run(t.Context(), args, &whole, &whole); status != statusDone {
			t.Fatalf("%s: status %d: %s", command, status, whole.String())
		}
		size := whole.Len()
		for _, room := range []int{0, 1, size / 3, size / 2, size - 1} {
			var stderr bytes.Buffer
			if status := run(t.Context(), args, &full{room}, &stderr); status != statusFailed || !oneError(stderr.String()) {
				t.Errorf("%s with room for %d of %d bytes: status %d, %q; want status %d and one line", command, room, size, status, stderr.String(), statusFailed)
			}
		}
	}
}

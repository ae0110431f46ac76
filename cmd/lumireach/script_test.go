package main

import (
	"errors"
	"flag"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "write the expected output in testdata/script anew")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"lumireach": main})
}

// TestScripts runs testdata/script, with two commands beside the usual ones:
//
//	exits STATUS COMMAND…  runs a command, which must end with that exit status
//	refuses [PATTERN]      the last one wrote nothing to standard output and to
//	                       standard error one line, which has the pattern in it
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 filepath.Join("..", "..", "testdata", "script"),
		UpdateScripts:       *update,
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits":   exits,
			"refuses": refuses,
		},
	})
}

func exits(ts *testscript.TestScript, not bool, args []string) {
	if not || len(args) < 2 {
		ts.Fatalf("usage: exits STATUS COMMAND…")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	got := 0
	var ended *exec.ExitError
	if err := ts.Exec(args[1], args[2:]...); errors.As(err, &ended) {
		got = ended.ExitCode()
	} else {
		ts.Check(err)
	}
	if got != want {
		ts.Fatalf("%s exits with %d, want %d", strings.Join(args[1:], " "), got, want)
	}
}

func refuses(ts *testscript.TestScript, not bool, args []string) {
	if not || len(args) > 1 {
		ts.Fatalf("usage: refuses [PATTERN]")
	}
	if stdout := ts.ReadFile("stdout"); stdout != "" {
		ts.Fatalf("standard output is %q, want nothing", stdout)
	}
	stderr := ts.ReadFile("stderr")
	if !oneError(stderr) {
		ts.Fatalf("standard error is %q, want one line, lumireach: …", stderr)
	}
	if len(args) == 1 && !regexp.MustCompile(args[0]).MatchString(stderr) {
		ts.Fatalf("standard error is %q, want %q in it", stderr, args[0])
	}
}

// oneError says whether standard error holds one line of the program's and no
// escape sequence.
func oneError(stderr string) bool {
	return strings.HasPrefix(stderr, "lumireach: ") && strings.HasSuffix(stderr, "\n") &&
		strings.Count(stderr, "\n") == 1 && !strings.ContainsAny(stderr, "\x1b\r")
}

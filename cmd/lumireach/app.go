package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"runtime/debug"
	"slices"
	"strings"

	"github.com/urfave/cli/v2"

	"lumireach/physics"
)

// Exit statuses.
const (
	statusDone        = 0
	statusFailed      = 1 // it could not be computed
	statusUsage       = 2 // the command or the scenario is wrong
	statusInterrupted = 130
)

// usageError is a command that is wrong.
type usageError struct{ what string }

func (e usageError) Error() string { return e.what }

func usagef(format string, args ...any) error { return usageError{fmt.Sprintf(format, args...)} }

// run is the program: results to stdout, the rest to stderr. It returns the exit
// status.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	app := newApp(stdout, stderr)
	arguments, err := arrange(app, args[1:])
	if err == nil {
		err = app.RunContext(ctx, append([]string{app.Name}, arguments...))
	}
	var usage usageError
	var scenario *physics.Error
	switch {
	case err == nil:
		return statusDone
	case errors.Is(err, context.Canceled):
		fmt.Fprintln(stderr, "lumireach: interrupted, nothing was written")
		return statusInterrupted
	case errors.As(err, &scenario):
		fmt.Fprintln(stderr, "lumireach:", oneLine(err))
		return statusUsage
	case errors.As(err, &usage):
		fmt.Fprintln(stderr, "lumireach:", oneLine(err))
		return statusUsage
	}
	fmt.Fprintln(stderr, "lumireach:", oneLine(err))
	return statusFailed
}

func oneLine(err error) string { return strings.Join(strings.Fields(err.Error()), " ") }

func newApp(stdout, stderr io.Writer) *cli.App {
	usage := func(_ *cli.Context, err error, _ bool) error { return usagef("%v; see lumireach --help", err) }
	app := &cli.App{
		Name:    "lumireach",
		Usage:   "expected discovery and exclusion reach of a search against luminosity",
		Version: version(),
		Description: "A scenario file describes the search; without one, commands run on a demonstration.\n\n" +
			"   lumireach                          the demonstration's reach\n" +
			"   lumireach reach my.toml            your own\n" +
			"   lumireach reach my.toml --toys 0   by formulas alone, at once\n" +
			"   lumireach yields --print-demo      a scenario to start from",
		Writer:          stdout,
		ErrWriter:       stderr,
		HideHelpCommand: true,
		OnUsageError:    usage,
		ExitErrHandler:  func(*cli.Context, error) {},
		Commands:        []*cli.Command{reachCommand(), bandsCommand(), crosscheckCommand(), yieldsCommand()},
	}
	for _, c := range app.Commands {
		c.OnUsageError = usage
		c.HideHelpCommand = true
		c.ArgsUsage = "[SCENARIO]"
	}
	cli.VersionPrinter = func(c *cli.Context) { fmt.Fprintf(c.App.Writer, "lumireach %s\n", c.App.Version) }
	return app
}

// version of the program as built.
func version() string {
	if info, ok := debug.ReadBuildInfo(); ok && info.Main.Version != "" && info.Main.Version != "(devel)" {
		return info.Main.Version
	}
	return "0.1.0-dev"
}

// arrange puts options before the scenario, as the parser wants them, and names
// what is wrong with a command line before it runs.
func arrange(app *cli.App, args []string) ([]string, error) {
	global := []string{"--help", "-h", "--version", "-v"}
	if len(args) == 0 {
		return []string{"reach"}, nil
	}
	if slices.Contains(global, args[0]) {
		if len(args) > 1 {
			return nil, usagef("%s stands alone, %q is too many", args[0], args[1])
		}
		return args, nil
	}
	name := args[0]
	rest := args[1:]
	var command *cli.Command
	if strings.HasPrefix(name, "-") {
		name, rest = "reach", args // options alone are those of the main job
	}
	var names []string
	for _, c := range app.Commands {
		names = append(names, c.Name)
		if c.Name == name {
			command = c
		}
	}
	if command == nil {
		if _, err := os.Stat(name); err == nil || strings.HasSuffix(name, ".toml") {
			return nil, usagef("%q is no command: did you mean lumireach reach %s?", name, name)
		}
		return nil, usagef("%q is no command: %s", name, physics.Suggest(name, names))
	}

	takesValue := map[string]bool{"help": false, "h": false}
	var options []string
	for _, f := range command.Flags {
		_, isBool := f.(*cli.BoolFlag)
		for _, n := range f.Names() {
			takesValue[n] = !isBool
			options = append(options, "--"+n)
		}
	}
	var flags, positional []string
	for i := 0; i < len(rest); i++ {
		arg := rest[i]
		if arg == "--" {
			positional = append(positional, rest[i+1:]...)
			break
		}
		if !strings.HasPrefix(arg, "-") || arg == "-" {
			positional = append(positional, arg)
			continue
		}
		option, _, assigned := strings.Cut(strings.TrimLeft(arg, "-"), "=")
		value, known := takesValue[option]
		if !known {
			return nil, usagef("%s has no option %s: %s", name, strings.SplitN(arg, "=", 2)[0], physics.Suggest("--"+option, options))
		}
		if option == "help" || option == "h" {
			return []string{name, "--help"}, nil // whatever else is there
		}
		flags = append(flags, arg)
		if value && !assigned {
			if i+1 == len(rest) {
				return nil, usagef("option %s needs a value", arg)
			}
			i++
			flags = append(flags, rest[i])
		}
	}
	if len(positional) > 1 {
		return nil, usagef("%s takes one scenario, not %d: %q is too many", name, len(positional), positional[1])
	}
	if len(positional) > 0 {
		flags = append(append(flags, "--"), positional...)
	}
	return append([]string{name}, flags...), nil
}

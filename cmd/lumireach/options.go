package main

import (
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/physics"
	"lumireach/toys"
)

const (
	defaultToys    = "5000"
	fixedNuisances = string(toys.Fixed)
)

// Options that commands share; toys is how many by default. Values are texts here, so that what is wrong with
// them is said in the program's own words.
func runFlags(toys string) []cli.Flag {
	return []cli.Flag{
		&cli.StringFlag{Name: "toys", Value: toys, Usage: "pseudo-experiments per luminosity and hypothesis; 0 for formulas only"},
		&cli.StringFlag{Name: "precision", Usage: "instead of --toys: throw until medians and goals are known to this fraction, such as 0.02"},
		&cli.StringFlag{Name: "within", Usage: "most time that --precision may take, such as 60s; it reports what it reached"},
		&cli.StringFlag{Name: "seed", Value: "1", Usage: "of all random numbers"},
		&cli.StringFlag{Name: "workers", Value: "0", Usage: "goroutines; never changes a result; 0 for all cores"},
		&cli.StringFlag{Name: "luminosity", Usage: "list that replaces the scenario's, such as 1,10,100"},
		&cli.StringFlag{Name: "from", Usage: "first of --points luminosities, spaced by equal ratios"},
		&cli.StringFlag{Name: "to", Usage: "last of --points luminosities"},
		&cli.StringFlag{Name: "points", Usage: "how many luminosities between --from and --to"},
		&cli.StringFlag{Name: "confidence", Value: "0.95", Usage: "of limits"},
		&cli.StringFlag{Name: "nuisances", Value: fixedNuisances, Usage: "of toys: fixed, with auxiliary measurements that fluctuate, or drawn anew for every toy"},
	}
}

func muFlag() cli.Flag {
	return &cli.StringFlag{Name: "mu", Value: "1", Usage: "strength of the signal that is hoped for; exclusion is always of 1"}
}

func outputFlags(formats string) []cli.Flag {
	return []cli.Flag{
		&cli.StringFlag{Name: "format", Value: "table", Usage: formats},
		&cli.StringFlag{Name: "out", Usage: "file for the result, replaced whole or not at all"},
		&cli.BoolFlag{Name: "quiet", Usage: "no progress, no notes on standard error"},
	}
}

func number(c *cli.Context, name string) (float64, error) {
	text := c.String(name)
	v, err := strconv.ParseFloat(text, 64)
	if err != nil || math.IsNaN(v) || math.IsInf(v, 0) {
		return 0, usagef("--%s is %q, must be a number", name, text)
	}
	return v, nil
}

func whole(c *cli.Context, name string, least, most uint64) (uint64, error) {
	text := c.String(name)
	v, err := strconv.ParseUint(text, 10, 64)
	if err != nil || v < least || v > most {
		return 0, usagef("--%s is %q, must be a whole number from %d to %d", name, text, least, most)
	}
	return v, nil
}

// mostToys is more than a day of one core.
const mostToys = 1_000_000_000

// config reads the options of a run.
func config(c *cli.Context, s *physics.Scenario) (toys.Config, error) {
	var out toys.Config
	n, err := whole(c, "toys", 0, mostToys)
	if err != nil {
		return out, err
	}
	if n > 0 && n < toys.MinToys {
		return out, usagef("--toys is %d, must be 0 for formulas only or at least %d: fewer give no error of a 2σ quantile", n, toys.MinToys)
	}
	out.Toys = int(n)
	if out.Seed, err = whole(c, "seed", 0, math.MaxUint64); err != nil {
		return out, err
	}
	workers, err := whole(c, "workers", 0, 4096)
	if err != nil {
		return out, err
	}
	out.Workers = int(workers)
	if out.Confidence, err = number(c, "confidence"); err != nil {
		return out, err
	}
	if !(out.Confidence > 0.5 && out.Confidence < 1) {
		return out, usagef("--confidence is %v, must lie between 0.5 and 1, such as 0.95", out.Confidence)
	}
	out.Nuisances = toys.Nuisances(c.String("nuisances"))
	if out.Nuisances != toys.Fixed && out.Nuisances != toys.Drawn {
		return out, usagef("--nuisances is %q, must be %s or %s", out.Nuisances, toys.Fixed, toys.Drawn)
	}
	if c.IsSet("mu") {
		if out.Mu, err = number(c, "mu"); err != nil {
			return out, err
		}
		if !(out.Mu >= toys.LeastMu && out.Mu <= toys.MostMu) {
			return out, usagef("--mu is %v, must be from %v to %v: scale the rates instead", out.Mu, toys.LeastMu, toys.MostMu)
		}
	}
	if c.IsSet("precision") {
		if c.IsSet("toys") {
			return out, usagef("--precision and --toys stand together: give one of them")
		}
		if out.Precision, err = number(c, "precision"); err != nil {
			return out, err
		}
		if !(out.Precision >= 1e-4 && out.Precision < 1) {
			return out, usagef("--precision is %v, must be from 0.0001 to below 1, such as 0.02", out.Precision)
		}
	}
	if c.IsSet("within") {
		if !c.IsSet("precision") {
			return out, usagef("--within bounds the time of --precision, which is not given")
		}
		out.Within, err = time.ParseDuration(c.String("within"))
		if err != nil || out.Within <= 0 {
			return out, usagef("--within is %q, must be a time such as 60s or 5m", c.String("within"))
		}
	}
	out.Luminosities, err = luminosities(c, s)
	return out, err
}

func luminosities(c *cli.Context, s *physics.Scenario) ([]float64, error) {
	spacing := []string{"from", "to", "points"}
	spaced := slices.ContainsFunc(spacing, c.IsSet)
	switch {
	case c.IsSet("luminosity") && spaced:
		return nil, usagef("--luminosity stands with --from, --to or --points: give either the list or all three of these")
	case c.IsSet("luminosity"):
		var values []float64
		for _, text := range strings.Split(c.String("luminosity"), ",") {
			v, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
			if err != nil {
				return nil, usagef("--luminosity has %q in it, must be numbers such as 1,10,100", text)
			}
			values = append(values, v)
		}
		out, err := physics.Luminosities(values)
		if err != nil {
			return nil, usagef("--luminosity: %v", err)
		}
		return out, nil
	case spaced:
		for _, name := range spacing {
			if !c.IsSet(name) {
				return nil, usagef("--%s is missing: --from, --to and --points go together", name)
			}
		}
		from, err := number(c, "from")
		if err != nil {
			return nil, err
		}
		to, err := number(c, "to")
		if err != nil {
			return nil, err
		}
		points, err := whole(c, "points", 2, 200)
		if err != nil {
			return nil, err
		}
		out, err := physics.Spaced(from, to, int(points))
		if err != nil {
			return nil, usagef("luminosities: %v", err)
		}
		return out, nil
	}
	return s.Luminosities, nil
}

// format reads --format.
func format(c *cli.Context, known ...string) (string, error) {
	name := c.String("format")
	if !slices.Contains(known, name) {
		return "", usagef("--format is %q, must be one of %s", name, strings.Join(known, ", "))
	}
	return name, nil
}

// scenario reads the scenario named, or takes the demonstration.
func scenario(c *cli.Context) (*physics.Scenario, error) {
	if path := c.Args().First(); path != "" {
		return physics.Read(path)
	}
	return physics.Demo(), nil
}

// sayDemonstration notes on standard error that no scenario was given. It comes
// after every check of the options: what is wrong with them stands alone there.
func sayDemonstration(c *cli.Context) {
	if c.Args().First() == "" && !c.Bool("quiet") {
		fmt.Fprintln(c.App.ErrWriter, "lumireach: no scenario given: this is the demonstration; lumireach yields --print-demo writes it out as a start for your own")
	}
}

func headerOf(c *cli.Context, s *physics.Scenario) report.Header {
	return report.Header{
		Command: c.Command.Name, Version: c.App.Version,
		Title: s.Title, Source: s.Source, SHA256: s.SHA256, Unit: s.Unit,
	}
}

// checkOut refuses a file of --out that could not be written, before the run.
func checkOut(c *cli.Context) error {
	path := c.String("out")
	if path == "" {
		return nil
	}
	if info, err := os.Stat(path); err == nil && !info.Mode().IsRegular() {
		// To replace a device would take it away from everyone.
		return usagef("--out %s is a directory or a device, must be a file", path)
	}
	if info, err := os.Stat(filepath.Dir(path)); err != nil || !info.IsDir() {
		return usagef("--out %s: there is no directory %s", path, filepath.Dir(path))
	}
	return nil
}

// output writes a result to standard output or to the file of --out.
func output(c *cli.Context, write func(io.Writer) error) error {
	if path := c.String("out"); path != "" {
		return replace(path, write)
	}
	return write(c.App.Writer)
}

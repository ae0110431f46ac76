package main

import (
	"context"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/stats"
	"lumireach/toys"
)

// verdictToys is more than other commands throw: a verdict stands on several
// standard errors.
const verdictToys = "10000"

// chanceTolerance is how far a chance of the formulas may be off.
const chanceTolerance = 0.02

func crosscheckCommand() *cli.Command {
	flags := append(runFlags(verdictToys), muFlag(),
		&cli.StringFlag{Name: "tolerance", Value: "0.05", Usage: "relative, of limits and luminosities"},
		&cli.StringFlag{Name: "tolerance-z", Value: "0.1", Usage: "of significances, in standard deviations"})
	return &cli.Command{
		Name:  "crosscheck",
		Usage: "the formulas against toys, with a verdict on each number",
		Flags: append(flags, outputFlags("table or json")...),
		Action: func(c *cli.Context) error {
			tolerances := toys.Tolerances{Chance: chanceTolerance}
			for name, value := range map[string]*float64{"tolerance": &tolerances.Relative, "tolerance-z": &tolerances.Z} {
				v, err := number(c, name)
				if err != nil {
					return err
				}
				if !(v > 0 && v < 10) {
					return usagef("--%s is %v, must be above 0 and below 10", name, v)
				}
				*value = v
			}
			for _, name := range []string{"precision", "within"} {
				if c.IsSet(name) {
					return usagef("crosscheck has no --%s: each verdict says how many toys it lacks", name)
				}
			}
			if c.String("toys") == "0" {
				return usagef("--toys is 0, and a cross-check needs toys: at least %d", toys.MinToys)
			}
			run := func(ctx context.Context, search stats.Search, config toys.Config) (*toys.CrosscheckResult, error) {
				return toys.Crosscheck(ctx, search, config, tolerances)
			}
			return compute(c, run, renderers[toys.CrosscheckResult]{table: report.CrosscheckTable, json: report.CrosscheckJSON})
		},
	}
}

package main

import (
	"context"
	"io"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/stats"
	"lumireach/toys"
)

func reachCommand() *cli.Command {
	return &cli.Command{
		Name:  "reach",
		Usage: "discovery and exclusion reach against luminosity, by formulas and by toys",
		Flags: append(append(runFlags(defaultToys), muFlag()), outputFlags("table, json or csv")...),
		Action: func(c *cli.Context) error {
			return compute(c, toys.Reach, renderers[toys.ReachResult]{
				table: report.ReachTable, json: report.ReachJSON, csv: report.ReachCSV,
			})
		},
	}
}

func bandsCommand() *cli.Command {
	return &cli.Command{
		Name:  "bands",
		Usage: "expected-limit bands on the signal strength against luminosity, by formulas and by toys",
		Flags: append(runFlags(defaultToys), outputFlags("table, json or csv")...),
		Action: func(c *cli.Context) error {
			return compute(c, toys.Bands, renderers[toys.BandsResult]{
				table: report.BandsTable, json: report.BandsJSON, csv: report.BandsCSV,
			})
		},
	}
}

// renderers write one kind of result in the formats there are; csv may be nil.
type renderers[R any] struct {
	table, json, csv func(io.Writer, report.Header, *R) error
}

// compute is the way of every command that throws toys: options and scenario,
// one call of the library, the result in the format asked for.
func compute[R any](c *cli.Context, run func(context.Context, stats.Search, toys.Config) (*R, error), render renderers[R]) error {
	write := map[string]func(io.Writer, report.Header, *R) error{"table": render.table, "json": render.json}
	known := []string{"table", "json"}
	if render.csv != nil {
		write["csv"] = render.csv
		known = append(known, "csv")
	}
	form, err := format(c, known...)
	if err != nil {
		return err
	}
	if err := checkOut(c); err != nil {
		return err
	}
	s, err := scenario(c)
	if err != nil {
		return err
	}
	settings, err := config(c, s)
	if err != nil {
		return err
	}
	sayDemonstration(c)
	bar := newProgress(c)
	settings.Progress = bar.update
	result, err := run(c.Context, s.Model, settings)
	bar.end()
	if err != nil {
		return err
	}
	return output(c, func(w io.Writer) error {
		return write[form](w, headerOf(c, s), result)
	})
}

package main

import (
	"io"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/toys"
)

func reachCommand() *cli.Command {
	return &cli.Command{
		Name:   "reach",
		Usage:  "discovery and exclusion reach against luminosity, by formulas and by toys",
		Flags:  append(append(runFlags(), muFlag()), outputFlags("table, json or csv")...),
		Action: reach,
	}
}

func reach(c *cli.Context) error {
	form, err := format(c, "table", "json", "csv")
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
	if settings.Mu, err = number(c, "mu"); err != nil {
		return err
	}
	if !(settings.Mu > 0) {
		return usagef("--mu is %v, must be above 0", settings.Mu)
	}
	sayDemonstration(c)
	bar := newProgress(c)
	settings.Progress = bar.update
	result, err := toys.Reach(c.Context, s.Model, settings)
	bar.end()
	if err != nil {
		return err
	}
	header := headerOf(c, s)
	header.Notes = result.Notes
	return output(c, func(w io.Writer) error {
		switch form {
		case "json":
			return report.ReachJSON(w, header, result)
		case "csv":
			return report.ReachCSV(w, header, result)
		}
		return report.ReachTable(w, header, result)
	})
}

package main

import (
	"io"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/toys"
)

func bandsCommand() *cli.Command {
	return &cli.Command{
		Name:   "bands",
		Usage:  "expected-limit bands on the signal strength against luminosity, by formulas and by toys",
		Flags:  append(runFlags(), outputFlags("table, json or csv")...),
		Action: bands,
	}
}

func bands(c *cli.Context) error {
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
	sayDemonstration(c)
	bar := newProgress(c)
	settings.Progress = bar.update
	result, err := toys.Bands(c.Context, s.Model, settings)
	bar.end()
	if err != nil {
		return err
	}
	header := headerOf(c, s)
	header.Notes = result.Notes
	return output(c, func(w io.Writer) error {
		switch form {
		case "json":
			return report.BandsJSON(w, header, result)
		case "csv":
			return report.BandsCSV(w, header, result)
		}
		return report.BandsTable(w, header, result)
	})
}

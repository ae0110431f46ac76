package main

import (
	"io"

	"github.com/urfave/cli/v2"

	"lumireach/cmd/lumireach/internal/report"
	"lumireach/physics"
)

func yieldsCommand() *cli.Command {
	return &cli.Command{
		Name:  "yields",
		Usage: "check a scenario; its expected yields, parameters and uncertainties at a luminosity",
		Flags: append([]cli.Flag{
			&cli.StringFlag{Name: "luminosity", Usage: "one luminosity; the middle one listed if not given"},
			&cli.BoolFlag{Name: "print-demo", Usage: "write the demonstration scenario out instead"},
		}, outputFlags("table or json")...),
		Action: yields,
	}
}

func yields(c *cli.Context) error {
	form, err := format(c, "table", "json")
	if err != nil {
		return err
	}
	if err := checkOut(c); err != nil {
		return err
	}
	if c.Bool("print-demo") {
		if path := c.Args().First(); path != "" {
			return usagef("--print-demo writes the demonstration and takes no scenario, not %q", path)
		}
		return output(c, func(w io.Writer) error {
			_, err := io.WriteString(w, physics.DemoText())
			return err
		})
	}
	s, err := scenario(c)
	if err != nil {
		return err
	}
	luminosity := s.Luminosities[len(s.Luminosities)/2]
	if c.IsSet("luminosity") {
		if luminosity, err = number(c, "luminosity"); err != nil {
			return err
		}
		if !(luminosity > 0) {
			return usagef("--luminosity is %v, must be above 0", luminosity)
		}
	}
	if _, err := s.Model(luminosity); err != nil {
		return err
	}
	sayDemonstration(c)
	return output(c, func(w io.Writer) error {
		if form == "json" {
			return report.YieldsJSON(w, headerOf(c, s), s.Yields(luminosity))
		}
		return report.YieldsTable(w, headerOf(c, s), s.Yields(luminosity))
	})
}

// Package physics describes a search: channels with their signals and
// backgrounds, the shapes of these over a mass window, and the uncertainties
// that act on them, which may shrink with luminosity. It reads a scenario from a
// TOML file, with templates in CSV files, and compiles it, at any luminosity, to
// the model that package stats fits.
//
// It answers what is expected: events per process and bin at a luminosity, which
// parameter moves what by how much, and what the statistics of the simulation
// leave uncertain.
//
// It refuses, in one line with file, line and column, whatever it cannot stand
// behind: unknown keys, values of the wrong kind, names that do not exist,
// peaks that miss their window, backgrounds that vanish by underflow in a bin
// where signal can fall. Counting channels and mass windows of equal or unequal
// bins are understood, with the shapes uniform, exponential, gaussian, power,
// bernstein, crystal-ball, voigt and template.
//
// The caller watches the units: a luminosity is in the unit of its scenario,
// rates are selected events per unit luminosity in the channel's window, and
// positions, widths and slopes are in the unit of that window. Fractions are
// normalised to one over the window for every value of a shape's parameters, so
// that a rate always means events in the window; what leaks out is not counted.
package physics

package report

// Header is what every output says of where it comes from.
type Header struct {
	Command string // of the program, such as "reach"
	Version string // of the program
	Title   string // of the scenario
	Source  string // path of the scenario as given, or "demonstration"
	SHA256  string // of the scenario's bytes
	Unit    string // of luminosity, a label
}

// demonstration is the Source of the embedded scenario.
const demonstration = "demonstration"

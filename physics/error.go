package physics

import "fmt"

// Error says in one line what is wrong with a scenario, and what would be right.
type Error struct {
	File   string // path as given; of a template where the fault is there
	Line   int    // from 1; 0 where the fault is not at a place in the file
	Column int    // from 1, in characters
	What   string
}

// Error gives file:line:column: what.
func (e *Error) Error() string {
	if e.Line == 0 {
		return fmt.Sprintf("%s: %s", e.File, e.What)
	}
	return fmt.Sprintf("%s:%d:%d: %s", e.File, e.Line, e.Column, e.What)
}

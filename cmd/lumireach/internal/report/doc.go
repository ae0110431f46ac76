// Package report renders results as tables for people, as JSON and as CSV for
// programs. It computes nothing: every number in its output is one of the
// result's, rounded in tables and unrounded elsewhere. Where a result has no
// number it prints a dash or null, with the reason beside it.
package report

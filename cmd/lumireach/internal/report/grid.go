package report

import (
	"io"
	"strings"
	"unicode"
)

// grid is a table of right-aligned cells, but for the first columns of words.
// One rule stands under its header lines, in which a cell followed by across, once
// or more often, is centred over all their columns.
type grid struct {
	words int   // left-aligned columns
	gaps  []int // spaces before each column
	lines [][]string
	rule  int // lines above the rule
}

// across continues the cell before it.
const across = "\x00"

func (g *grid) add(cells ...string) { g.lines = append(g.lines, cells) }

// header ends the header lines.
func (g *grid) header() { g.rule = len(g.lines) }

func (g *grid) write(w io.Writer) error {
	var widths []int
	for _, line := range g.lines {
		for k, cell := range line {
			if k == len(widths) {
				widths = append(widths, 0)
			}
			if cell != across && !(k+1 < len(line) && line[k+1] == across) {
				widths[k] = max(widths[k], columns(cell))
			}
		}
	}
	for _, line := range g.lines { // a text across columns fits them
		for k, cell := range line {
			if n := spanned(line, k); n > 1 && cell != across {
				lack := columns(cell) - g.span(widths, k, n)
				widths[k+n-1] += max(0, lack)
			}
		}
	}
	total := 0
	for k, width := range widths {
		total += width + g.gap(k)
	}
	var b strings.Builder
	for i, line := range g.lines {
		if i == g.rule && g.rule > 0 {
			b.WriteString(strings.Repeat("─", total) + "\n")
		}
		var row strings.Builder
		for k, cell := range line {
			if cell == across {
				continue
			}
			row.WriteString(strings.Repeat(" ", g.gap(k)))
			n := spanned(line, k)
			space := max(0, g.span(widths, k, n)-columns(cell))
			left := space
			switch {
			case n > 1:
				left = (space + 1) / 2
			case k < g.words:
				left = 0
			}
			row.WriteString(strings.Repeat(" ", left) + cell + strings.Repeat(" ", space-left))
		}
		b.WriteString(strings.TrimRight(row.String(), " ") + "\n")
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// spanned is how many columns the cell at k of a line stands over.
func spanned(line []string, k int) int {
	n := 1
	for k+n < len(line) && line[k+n] == across {
		n++
	}
	return n
}

// span is the width of n columns from k with the gaps between them.
func (g *grid) span(widths []int, k, n int) int {
	wide := widths[k]
	for i := k + 1; i < k+n; i++ {
		wide += g.gap(i) + widths[i]
	}
	return wide
}

func (g *grid) gap(k int) int {
	switch {
	case k < len(g.gaps):
		return g.gaps[k]
	case k == 0:
		return 0
	}
	return 3
}

// columns is how wide a text stands: combining marks, as in q̃, take no room.
func columns(s string) int {
	n := 0
	for _, r := range s {
		if !unicode.Is(unicode.Mn, r) {
			n++
		}
	}
	return n
}

// paragraphs wraps notes at a width, each with a mark before it.
func paragraphs(notes []string, mark string, width int) string {
	var b strings.Builder
	for _, note := range notes {
		indent := strings.Repeat(" ", columns(mark))
		line := mark
		used := columns(mark)
		first := true
		for _, word := range strings.Fields(note) {
			length := columns(word)
			if !first && used+1+length > width {
				b.WriteString(line + "\n")
				line, used, first = indent, columns(indent), true
			}
			if !first {
				line += " "
				used++
			}
			line += word
			used += length
			first = false
		}
		b.WriteString(line + "\n")
	}
	return b.String()
}

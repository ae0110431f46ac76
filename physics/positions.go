package physics

import (
	"bytes"
	"strconv"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2/unstable"
)

// positions maps the path of every key, table and list entry of a TOML document
// to its place, as an offset in bytes.
type positions map[string]int

// join extends a path. TOML keys hold no NUL, so that it can separate them.
func join(path, part string) string { return path + "\x00" + part }

func joinIndex(path string, i int) string { return join(path, strconv.Itoa(i)) }

// locate finds the places in a document that is known to be valid.
func locate(document []byte) positions {
	at := positions{}
	entries := map[string]int{} // of each list of tables written with [[ ]]
	var p unstable.Parser
	p.Reset(document)
	table := ""
	for p.NextExpression() {
		expression := p.Expression()
		switch expression.Kind {
		case unstable.Table, unstable.ArrayTable:
			table = ""
			keys := expression.Key()
			for keys.Next() {
				key := keys.Node()
				table = join(table, string(key.Data))
				offset := int(key.Raw.Offset)
				start := bytes.LastIndexByte(document[:offset], '\n') + 1
				header := start + bytes.IndexByte(document[start:offset], '[')
				at.note(table, header)
				if keys.IsLast() && expression.Kind == unstable.ArrayTable {
					entries[table]++
				}
				if n := entries[table]; n > 0 {
					table = joinIndex(table, n-1)
					at.note(table, header)
				}
			}
		case unstable.KeyValue:
			at.keyValue(table, expression)
		}
	}
	return at
}

// note keeps the first place of a path.
func (at positions) note(path string, offset int) {
	if _, known := at[path]; !known {
		at[path] = offset
	}
}

func (at positions) keyValue(table string, node *unstable.Node) {
	path, offset := table, 0
	keys := node.Key()
	for keys.Next() {
		path = join(path, string(keys.Node().Data))
		offset = int(keys.Node().Raw.Offset)
		at.note(path, offset)
	}
	at.value(path, offset, node.Value())
}

func (at positions) value(path string, offset int, node *unstable.Node) {
	children := node.Children()
	switch node.Kind {
	case unstable.InlineTable:
		for children.Next() {
			at.keyValue(path, children.Node())
		}
	case unstable.Array:
		for i := 0; children.Next(); i++ {
			child := children.Node()
			entry := joinIndex(path, i)
			if child.Raw.Length > 0 { // a list in a list carries no place of its own
				offset = int(child.Raw.Offset)
			}
			at.note(entry, offset)
			at.value(entry, offset, child)
		}
	}
}

// lineColumn counts both from 1, columns in characters.
func lineColumn(document []byte, offset int) (line, column int) {
	before := document[:offset]
	line = 1 + bytes.Count(before, []byte{'\n'})
	start := bytes.LastIndexByte(before, '\n') + 1
	return line, 1 + utf8.RuneCount(before[start:])
}

// inCharacters turns a column in bytes, from 1, into one in characters, at most
// the one behind the line.
func inCharacters(document []byte, line, column int) int {
	for range line - 1 {
		document = document[bytes.IndexByte(document, '\n')+1:]
	}
	text, _, _ := bytes.Cut(document, []byte{'\n'})
	return 1 + utf8.RuneCount(text[:min(column-1, len(text))])
}

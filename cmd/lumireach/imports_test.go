package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"go/parser"
	"go/token"
	"io"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// mayImport says which packages of the project each may import. A package that
// is not here has to find its place here first.
var mayImport = map[string][]string{
	"lumireach/stats":                         {},
	"lumireach/physics":                       {"lumireach/stats"},
	"lumireach/toys":                          {"lumireach/stats"},
	"lumireach/cmd/lumireach/internal/report": {"lumireach/physics", "lumireach/toys"},
	"lumireach/cmd/lumireach":                 {"lumireach/stats", "lumireach/physics", "lumireach/toys", "lumireach/cmd/lumireach/internal/report"},
}

// generator is deprecated: one file alone imports it, which keeps it replaceable.
const generator = "golang.org/x/exp/rand"

type listed struct {
	ImportPath, Dir                    string
	Imports                            []string
	GoFiles, TestGoFiles, XTestGoFiles []string
}

func packages(t *testing.T) []listed {
	t.Helper()
	list := exec.CommandContext(t.Context(), "go", "list", "-json=ImportPath,Dir,Imports,GoFiles,TestGoFiles,XTestGoFiles", "lumireach/...")
	var stderr bytes.Buffer
	list.Stderr = &stderr
	text, err := list.Output()
	if err != nil {
		t.Fatalf("%v: %v\n%s", list, err, stderr.String())
	}
	var out []listed
	for d := json.NewDecoder(bytes.NewReader(text)); ; {
		var p listed
		if err := d.Decode(&p); errors.Is(err, io.EOF) {
			return out
		} else if err != nil {
			t.Fatal(err)
		}
		out = append(out, p)
	}
}

func TestImportEdges(t *testing.T) {
	found := 0
	for _, p := range packages(t) {
		allowed, known := mayImport[p.ImportPath]
		if !known {
			t.Errorf("%s is not in mayImport: say there what it may import", p.ImportPath)
			continue
		}
		found++
		for _, path := range p.Imports {
			if strings.HasPrefix(path, "lumireach/") && !slices.Contains(allowed, path) {
				t.Errorf("%s imports %s, may import %q alone of the project", p.ImportPath, path, allowed)
			}
		}
	}
	if found != len(mayImport) {
		t.Errorf("go list finds %d of the %d packages in mayImport", found, len(mayImport))
	}
}

func TestOneFileImportsTheGenerator(t *testing.T) {
	var importers []string
	for _, p := range packages(t) {
		for _, name := range slices.Concat(p.GoFiles, p.TestGoFiles, p.XTestGoFiles) {
			file, err := parser.ParseFile(token.NewFileSet(), filepath.Join(p.Dir, name), nil, parser.ImportsOnly)
			if err != nil {
				t.Fatal(err)
			}
			for _, i := range file.Imports {
				if i.Path.Value == `"`+generator+`"` {
					importers = append(importers, p.ImportPath+"/"+name)
				}
			}
		}
	}
	if len(importers) != 1 || !strings.HasPrefix(importers[0], "lumireach/toys/") || strings.HasSuffix(importers[0], "_test.go") {
		t.Errorf("%s is imported by %q, want one file of lumireach/toys, no test", generator, importers)
	}
}

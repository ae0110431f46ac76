package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// TestReadme runs the blocks of README.md that begin with "$ lumireach " and
// wants their very output. A line "…" alone stands for any number of lines. Files
// are the toml blocks that begin with "# NAME.toml".
func TestReadme(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	ran, faults := checkDocument(t.Context(), string(text))
	for _, fault := range faults {
		t.Error(fault)
	}
	if ran == 0 {
		t.Error("README.md has no block that begins with $ lumireach, want at least one")
	}
}

// checkDocument writes a document's files into the working directory and runs
// its commands there.
func checkDocument(ctx context.Context, text string) (ran int, faults []string) {
	all := blocks(text)
	for _, b := range all {
		first, _, _ := strings.Cut(b.text, "\n")
		if name, ok := strings.CutPrefix(first, "# "); ok && b.language == "toml" && strings.HasSuffix(name, ".toml") {
			if !filepath.IsLocal(name) || strings.ContainsAny(name, `/\`) {
				faults = append(faults, fmt.Sprintf("%q is no plain file name", name))
				continue
			}
			if err := os.WriteFile(name, []byte(b.text), 0o644); err != nil {
				faults = append(faults, err.Error())
			}
		}
	}
	for _, b := range all {
		if !strings.HasPrefix(b.text, prompt) {
			continue
		}
		for _, example := range strings.Split("\n"+b.text, "\n"+prompt)[1:] {
			ran++
			command, want, _ := strings.Cut(example, "\n")
			if fault := checkExample(ctx, command, want); fault != "" {
				faults = append(faults, fault)
			}
		}
	}
	return ran, faults
}

const prompt = "$ lumireach "

type block struct{ language, text string }

// blocks are the fenced blocks of a document, each line of them ended.
func blocks(text string) []block {
	var out []block
	inside := false
	for line := range strings.Lines(text) {
		line = strings.TrimRight(line, "\r\n")
		switch {
		case strings.HasPrefix(line, "```"):
			if inside = !inside; inside {
				out = append(out, block{language: strings.TrimSpace(strings.TrimLeft(line, "`"))})
			}
		case inside:
			out[len(out)-1].text += line + "\n"
		}
	}
	return out
}

func checkExample(ctx context.Context, command, want string) (fault string) {
	if strings.ContainsAny(command, "\"'|<>&;\\$`#") {
		return fmt.Sprintf("%s%s: only plain words are understood here, no shell", prompt, command)
	}
	pattern := `\A`
	for line := range strings.Lines(want) {
		if line == "…\n" {
			pattern += `(?:.*\n)*`
		} else {
			pattern += regexp.QuoteMeta(line)
		}
	}
	var stdout, stderr bytes.Buffer
	status := run(ctx, append([]string{"lumireach"}, strings.Fields(command)...), &stdout, &stderr)
	if status != statusDone {
		return fmt.Sprintf("%s%s: status %d: %s", prompt, command, status, stderr.String())
	}
	if !regexp.MustCompile(pattern + `\z`).MatchString(stdout.String()) {
		return fmt.Sprintf("%s%s\n--- the document has\n%s--- the program writes\n%s", prompt, command, want, stdout.String())
	}
	return ""
}

// TestCheckDocument holds the check itself to documents that are right and wrong.
func TestCheckDocument(t *testing.T) {
	const scenario = "```toml\n# count.toml\ntitle = \"Count\"\n[luminosity]\nunit = \"h\"\nvalues = [4]\n" +
		"[[channel]]\nname = \"all\"\nbins = 1\n[[channel.signal]]\nrate = 2\n[[channel.background]]\nname = \"rest\"\nrate = 3\n```\n"
	for _, tt := range []struct {
		name, text string
		ran        int
		fault      string // "" for none
	}{
		{"right", "Text.\n" + scenario + "```\n$ lumireach reach count.toml --toys 0 --luminosity 4 --format csv\nluminosity,engine,…\n```\n", 1, "the program writes"},
		{"output in full", "```\n$ lumireach --version\nlumireach " + version() + "\n```\n", 1, ""},
		{"line left out", "```\n$ lumireach --version\n```\n", 1, "the program writes"},
		{"line too many", "```\n$ lumireach --version\nlumireach " + version() + "\nmore\n```\n", 1, "the program writes"},
		{"ellipsis for none", "```\n$ lumireach --version\n…\nlumireach " + version() + "\n…\n```\n", 1, ""},
		{"ellipsis for many", scenario + "```console\n$ lumireach yields count.toml\nCount …\n…\n```\n", 1, "the program writes"},
		{"file and ellipsis", scenario + "```console\n$ lumireach yields count.toml\n…\n• The sizes of the uncertainties do not change with luminosity.\n```\n", 1, ""},
		{"wrong line after an ellipsis", scenario + "```\n$ lumireach yields count.toml\n…\n• The sizes change.\n```\n", 1, "the program writes"},
		{"two commands", "```\n$ lumireach --version\n…\n$ lumireach --version\nnothing\n```\n", 2, "the program writes"},
		{"command that fails", "```\n$ lumireach reech\n```\n", 1, "status 2"},
		{"shell", "```\n$ lumireach --version | cat\n```\n", 1, "only plain words"},
		{"no command", "```\n$ ls\n```\n    $ lumireach --version\n", 0, ""},
		{"path for a file", "```toml\n# ../count.toml\n```\n", 0, "no plain file name"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			t.Chdir(t.TempDir())
			ran, faults := checkDocument(t.Context(), tt.text)
			if ran != tt.ran {
				t.Errorf("%d commands ran, want %d", ran, tt.ran)
			}
			if got := strings.Join(faults, "\n"); (got == "") != (tt.fault == "") || !strings.Contains(got, tt.fault) {
				t.Errorf("faults %q, want %q", got, tt.fault)
			}
		})
	}
}

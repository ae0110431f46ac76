package report

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write testdata/golden/report anew")

// golden compares what write gives with a file of testdata/golden/report. The
// text that failed is kept by go test -artifacts, for a diff.
func golden(t *testing.T, name string, write func(*bytes.Buffer) error) {
	t.Helper()
	var got bytes.Buffer
	if err := write(&got); err != nil {
		t.Fatalf("%s: %v", name, err)
	}
	path := filepath.Join("..", "..", "..", "..", "testdata", "golden", "report", name)
	if *update {
		if err := os.WriteFile(path, got.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Equal(got.Bytes(), want) {
		return
	}
	kept := filepath.Join(t.ArtifactDir(), name)
	if err := os.WriteFile(kept, got.Bytes(), 0o644); err != nil {
		t.Error(err)
	}
	gotLines, wantLines := strings.Split(got.String(), "\n"), strings.Split(string(want), "\n")
	for i := range max(len(gotLines), len(wantLines)) {
		g, w := line(gotLines, i), line(wantLines, i)
		if g != w {
			t.Errorf("%s, line %d\n got %q\nwant %q", name, i+1, g, w)
			return
		}
	}
}

func line(lines []string, i int) string {
	if i < len(lines) {
		return lines[i]
	}
	return "(end)"
}

func TestReachGolden(t *testing.T) {
	for name, r := range reaches() {
		golden(t, "reach-"+name+".txt", func(b *bytes.Buffer) error { return ReachTable(b, header("reach"), r) })
		golden(t, "reach-"+name+".json", func(b *bytes.Buffer) error { return ReachJSON(b, header("reach"), r) })
		golden(t, "reach-"+name+".csv", func(b *bytes.Buffer) error { return ReachCSV(b, header("reach"), r) })
	}
}

func TestBandsGolden(t *testing.T) {
	for name, r := range bands() {
		golden(t, "bands-"+name+".txt", func(b *bytes.Buffer) error { return BandsTable(b, header("bands"), r) })
		golden(t, "bands-"+name+".json", func(b *bytes.Buffer) error { return BandsJSON(b, header("bands"), r) })
		golden(t, "bands-"+name+".csv", func(b *bytes.Buffer) error { return BandsCSV(b, header("bands"), r) })
	}
}

func TestYieldsGolden(t *testing.T) {
	y := expectedYields()
	golden(t, "yields.txt", func(b *bytes.Buffer) error { return YieldsTable(b, header("yields"), y) })
	golden(t, "yields.json", func(b *bytes.Buffer) error { return YieldsJSON(b, header("yields"), y) })
}

func TestCrosscheckGolden(t *testing.T) {
	golden(t, "crosscheck.txt", func(b *bytes.Buffer) error { return CrosscheckTable(b, header("crosscheck"), crosschecked()) })
	golden(t, "crosscheck.json", func(b *bytes.Buffer) error { return CrosscheckJSON(b, header("crosscheck"), crosschecked()) })
}

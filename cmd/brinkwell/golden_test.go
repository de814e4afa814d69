package main

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"golang.org/x/tools/txtar"
)

var update = flag.Bool("u", false, "write the golden files anew")

// wallClock matches what differs from run to run.
var wallClock = regexp.MustCompile(`[0-9.e+]+ ticks a second of wall time`)

// Every file of testdata/cli is one command line, its first line, which
// {DIR} may point to the file's own inputs, with what it must print and exit
// with. Lines BRINKWELL_…=… after the first are its environment.
func TestGolden(t *testing.T) {
	if runtime.GOARCH != "amd64" {
		t.Skip("the golden figures are amd64's: elsewhere fused multiplications change the last digits of a trajectory")
	}
	files, err := filepath.Glob("../../testdata/cli/*.txtar")
	if err != nil || len(files) == 0 {
		t.Fatalf("no golden files: %v", err)
	}
	for _, file := range files {
		t.Run(strings.TrimSuffix(filepath.Base(file), ".txtar"), func(t *testing.T) {
			t.Parallel()
			golden(t, file)
		})
	}
}

func golden(t *testing.T, file string) {
	archive, err := txtar.ParseFile(file)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(strings.TrimSpace(string(archive.Comment)), "\n")
	dir := t.TempDir()
	want := map[string]string{}
	var inputs []txtar.File
	for _, f := range archive.Files {
		switch f.Name {
		case "stdout", "stderr", "exit":
			want[f.Name] = string(f.Data)
		default:
			inputs = append(inputs, f)
			if err := os.WriteFile(filepath.Join(dir, f.Name), f.Data, 0o600); err != nil {
				t.Fatal(err)
			}
		}
	}
	var stdout, stderr bytes.Buffer
	args := strings.Fields(strings.ReplaceAll(lines[0], "{DIR}", dir))
	code := run(shell{out: &stdout, err: &stderr, environ: lines[1:]}, args)
	clean := func(b *bytes.Buffer) string {
		s := strings.ReplaceAll(b.String(), dir, "{DIR}")
		return wallClock.ReplaceAllString(s, "N ticks a second of wall time")
	}
	got := map[string]string{"stdout": clean(&stdout), "stderr": clean(&stderr), "exit": strconv.Itoa(code) + "\n"}
	if *update {
		archive.Files = inputs
		for _, name := range []string{"stdout", "stderr", "exit"} {
			archive.Files = append(archive.Files, txtar.File{Name: name, Data: []byte(got[name])})
		}
		if err := os.WriteFile(file, txtar.Format(archive), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	for _, name := range []string{"stdout", "stderr", "exit"} {
		if got[name] != want[name] {
			t.Errorf("%s differs from the golden file (renew it with go test ./cmd/brinkwell -u and read the difference):\n--- want\n%s\n--- got\n%s", name, want[name], got[name])
		}
	}
}

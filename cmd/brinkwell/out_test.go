package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

// A full recording gives the report again, but for the wall clock; its settings
// come with it.
func TestRecordingGivesTheReportAgain(t *testing.T) {
	dir, again := filepath.Join(t.TempDir(), "out"), filepath.Join(t.TempDir(), "again")
	for _, more := range [][]string{{"--set", "run.duration=0.3s"}, {"--set", "loop.lost_ticks=0.05", "--set", "output.lag=2us", "--set", "wells.tilt=0.5", "--set", "run.duration=0.3001234s"}} {
		args := append([]string{"bench", "--set", "loop.latency=2.4us", "--out", dir, "--record", "full"}, more...)
		if _, stderr, code := command(args...); code > exitTolerance {
			t.Fatalf("exit %d: %s", code, stderr)
		}
		if _, stderr, code := command("bench", "--reread", filepath.Join(dir, "recording"), "--out", again); code > exitTolerance {
			t.Fatalf("exit %d: %s", code, stderr)
		}
		read := func(dir string) map[string]any {
			data, err := os.ReadFile(filepath.Join(dir, "report.json"))
			if err != nil {
				t.Fatal(err)
			}
			var tree map[string]any
			if err := json.Unmarshal(data, &tree); err != nil {
				t.Fatal(err)
			}
			loop := tree["loop"].(map[string]any)
			delete(loop, "wall_s")
			delete(loop, "ticks_per_wall_second")
			return tree
		}
		if first, second := read(dir), read(again); !reflect.DeepEqual(first, second) {
			for k := range first {
				if !reflect.DeepEqual(first[k], second[k]) {
					t.Errorf("%s differs:\n%v\n%v", k, first[k], second[k])
				}
			}
		}
		for _, name := range []string{"settings.toml", "sheet.svg", "sheet.png", "landscape.svg", "spectrum.png"} {
			if info, err := os.Stat(filepath.Join(dir, name)); err != nil || info.Size() == 0 {
				t.Errorf("%s: %v", name, err)
			}
		}
		if err := os.RemoveAll(filepath.Join(dir, "recording")); err != nil {
			t.Fatal(err)
		}
	}
}

// What does not go together, or cannot be done, is said with the right exit
// code; a recording that is there is left alone.
func TestOutAndRecordRefuse(t *testing.T) {
	dir := t.TempDir()
	short := []string{"bench", "--set", "run.duration=0.05s"}
	if _, stderr, code := command(append(short, "--out", dir, "--record", "every=10")...); code > exitTolerance {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	for _, tt := range []struct {
		args []string
		code int
		says string
	}{
		{append(short, "--record", "full"), exitUsage, "--record needs --out"},
		{append(short, "--out", dir, "--record", "some"), exitUsage, "off, every=N"},
		{append(short, "--out", dir, "--record", "every=0"), exitUsage, "every=N"},
		{append(short, "--out", dir, "--record", "full"), exitWrite, "already holds a recording"},
		{append(short, "--out", filepath.Join(dir, "report.json", "x")), exitWrite, "report.json"},
		{[]string{"bench", "--reread", filepath.Join(dir, "recording")}, exitFailed, "every=10"},
		{[]string{"bench", "--reread", dir}, exitFailed, dir},
		{[]string{"bench", "--reread", dir, "--set", "loop.latency=1us"}, exitUsage, "--reread takes the settings"},
		{append(short, "--compare", "loop.latency=1us,2us", "--out", dir), exitUsage, "--compare shows several"},
	} {
		if _, stderr, code := command(tt.args...); code != tt.code || !strings.Contains(stderr, tt.says) {
			t.Errorf("%v: exit %d, %q, want %d and %q", tt.args[1:], code, stderr, tt.code, tt.says)
		}
	}
	if info, err := os.Stat(filepath.Join(dir, "recording", "samples.arrows")); err != nil || info.Size() == 0 {
		t.Errorf("the recording is gone: %v", err)
	}
}

package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// command runs a command line in this process.
func command(args ...string) (stdout, stderr string, code int) {
	var out, err bytes.Buffer
	code = run(shell{out: &out, err: &err}, args)
	return out.String(), err.String(), code
}

// The keys that others rely on; each must be a number, or an estimate with its
// interval in order.
var promised = []string{
	"asked.barrier_kT", "asked.distance_m", "asked.stiffness_N_per_m", "asked.tilt_kT",
	"realised.barrier_kT", "realised.distance_m", "realised.stiffness_N_per_m", "realised.tilt_kT",
	"realised.kinetic_temperature_ratio", "realised.width_temperature_ratio",
	"realised.mean_abs_position_m", "realised.density_at_threshold_per_m",
	"measured.barrier_kT", "measured.distance_m", "measured.stiffness_N_per_m", "measured.tilt_kT",
	"measured.kinetic_temperature_ratio", "measured.width_temperature_ratio",
	"measured.mean_abs_position_m", "measured.density_at_threshold_per_m",
	"measured.overshoot_m", "measured.energy_kT", "measured.power_kT_per_s",
	"crossings.count", "crossings.rate_per_s", "crossings.settled_rate_per_s", "crossings.mean_dwell_s",
	"crossings.overshoot_m", "crossings.energy_kT", "crossings.power_kT_per_s", "crossings.chatter_fraction",
	"loop.latency_mean_s", "loop.ticks_per_wall_second",
	"checks.stationary_identity.difference", "verdict.barrier.realised", "seed", "ticks",
}

func lookup(t *testing.T, tree any, path string) any {
	t.Helper()
	for name := range strings.SplitSeq(path, ".") {
		m, ok := tree.(map[string]any)
		if !ok || m[name] == nil {
			t.Fatalf("no %s in the report", path)
		}
		tree = m[name]
	}
	return tree
}

func TestJSONReport(t *testing.T) {
	file := filepath.Join(t.TempDir(), "report.json")
	text, stderr, code := command("bench", "--set", "run.duration=4s", "--json", file)
	if code != exitDone {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	var tree any
	if err := json.Unmarshal(data, &tree); err != nil {
		t.Fatal(err)
	}
	for _, path := range promised {
		switch v := lookup(t, tree, path).(type) {
		case float64:
		case map[string]any:
			value, low, high := lookup(t, v, "value").(float64), lookup(t, v, "low").(float64), lookup(t, v, "high").(float64)
			if !(low <= value && value <= high && low < high) {
				t.Errorf("%s: %v is not inside (%v, %v)", path, value, low, high)
			}
		default:
			t.Errorf("%s is %T", path, v)
		}
	}
	// The printed figures are those of the file.
	kinetic := lookup(t, tree, "realised.kinetic_temperature_ratio.value").(float64)
	if want := fmt.Sprintf("%.3f ±", kinetic); !strings.Contains(text, want) {
		t.Errorf("the text lacks %q of the file", want)
	}
	// Energy, count and power tell one story.
	count := lookup(t, tree, "crossings.count").(float64)
	energy := lookup(t, tree, "crossings.energy_kT.value").(float64)
	power := lookup(t, tree, "crossings.power_kT_per_s.value").(float64)
	if want := count * energy / 4; !(math.Abs(power-want) < 0.02*math.Abs(want)) {
		t.Errorf("power %v kT/s, want count·energy/time = %v", power, want)
	}
	if q := lookup(t, tree, "settings.resonator.quality").(float64); q != 35 {
		t.Errorf("settings.resonator.quality = %v, want 35", q)
	}
}

func TestJSONToStandardOutput(t *testing.T) {
	stdout, stderr, code := command("bench", "--set", "run.duration=3s", "--json", "-")
	if code != exitDone || !json.Valid([]byte(stdout)) {
		t.Errorf("exit %d, standard output is JSON alone: %v", code, json.Valid([]byte(stdout)))
	}
	if !strings.Contains(stderr, "verdict:") {
		t.Error("the text is not on standard error")
	}
}

// A file that cannot be written: exit 4, the report still on the terminal, and
// nothing half written.
func TestUnwritableFile(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "missing", "report.json")
	stdout, stderr, code := command("bench", "--set", "run.duration=3s", "--json", file)
	if code != exitWrite || !strings.Contains(stdout, "verdict:") || !strings.Contains(stderr, "missing") {
		t.Errorf("exit %d, want %d with the report and the file's name in the error: %s", code, exitWrite, stderr)
	}
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("%v was left behind", left)
	}
}

func TestNothingWrittenOnBadSettings(t *testing.T) {
	file := filepath.Join(t.TempDir(), "report.json")
	stdout, _, code := command("bench", "--set", "resonator.quality=-1", "--json", file)
	if _, err := os.Stat(file); code != exitUsage || stdout != "" || !errors.Is(err, os.ErrNotExist) {
		t.Errorf("exit %d, output %q, file: %v; want %d, none and none", code, stdout, err, exitUsage)
	}
}

// A file is replaced whole: the old one stays until the new one is complete.
func TestWriteFileReplaces(t *testing.T) {
	file := filepath.Join(t.TempDir(), "f")
	for _, text := range []string{"first, longer", "second"} {
		if err := writeFile(file, []byte(text)); err != nil {
			t.Fatal(err)
		}
		if got, _ := os.ReadFile(file); string(got) != text {
			t.Errorf("the file holds %q, want %q", got, text)
		}
	}
	if err := writeFile("/dev/full", []byte("x")); err == nil {
		t.Error("a full device takes the report without an error")
	}
}

// The settings that are shown give the same run again.
func TestShownSettingsGiveTheSameRun(t *testing.T) {
	args := []string{"bench", "--set", "run.duration=0.1s", "--set", "wells.tilt=0.3", "--set", "loop.latency=3.3us"}
	shown, _, code := command(append(args, "--show-settings")...)
	if code != exitDone {
		t.Fatalf("exit %d", code)
	}
	file := filepath.Join(t.TempDir(), "shown.toml")
	if err := os.WriteFile(file, []byte(shown), 0o600); err != nil {
		t.Fatal(err)
	}
	first, _, _ := command(args...)
	again, _, _ := command("bench", file)
	first = wallClock.ReplaceAllString(first, "")
	if again = wallClock.ReplaceAllString(again, ""); first != again {
		t.Errorf("the shown settings give another report:\n%s\n%s", first, again)
	}
}

// Ctrl-C ends a long run with a report and exit 0, and soon.
func TestInterrupt(t *testing.T) {
	if os.Getenv("BRINKWELL_TEST_RUN") != "" {
		os.Exit(run(shell{out: os.Stdout, err: os.Stderr}, strings.Fields(os.Getenv("BRINKWELL_TEST_RUN"))))
	}
	c := exec.Command(os.Args[0], "-test.run=^TestInterrupt$")
	c.Env = append(os.Environ(), "BRINKWELL_TEST_RUN=bench --set run.duration=100h")
	var out bytes.Buffer
	c.Stdout, c.Stderr = &out, &out
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	time.Sleep(time.Second)
	if err := c.Process.Signal(syscall.SIGINT); err != nil {
		t.Fatal(err)
	}
	timeout := time.AfterFunc(time.Minute, func() { _ = c.Process.Kill() })
	defer timeout.Stop()
	if err := c.Wait(); err != nil {
		t.Errorf("an interrupted run ends with %v, want exit 0\n%s", err, &out)
	}
	for _, want := range []string{"interrupted", "verdict:"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("the report lacks %q:\n%s", want, &out)
		}
	}
}

package settings

import (
	"slices"
	"strings"
	"testing"
)

// Wrong settings, and what the message must hold.
func TestWrong(t *testing.T) {
	tests := []struct {
		name      string
		file      string
		env, set  string
		fragments []string
	}{
		// What a reader of TOML, or of numbers, would let pass.
		{
			name: "bare number for a quantity", file: "[resonator]\nfrequency = 6500",
			fragments: []string{"resonator.frequency = 6500", "bench.toml", `a frequency needs a unit, such as "6.5 kHz"`},
		},
		{name: "bare zero for a quantity", file: "[loop]\nlatency = 0", fragments: []string{"loop.latency = 0", "needs a unit"}},
		{name: "quantity without unit in quotes", file: "[loop]\nlatency = \"1\"", fragments: []string{"loop.latency", "needs a unit"}},
		{name: "unit without number", file: "[loop]\nlatency = \"us\"", fragments: []string{"loop.latency", "decimal number and a unit"}},
		{
			name: "wrong dimension", file: "[resonator]\nfrequency = \"5 N/m\"",
			fragments: []string{"resonator.frequency", `"N/m" is not a unit for a frequency`, "6.5 kHz"},
		},
		{name: "overflow", file: "[resonator]\nfrequency = \"1e999 Hz\"", fragments: []string{"resonator.frequency", "too large"}},
		{name: "underflow", file: "[loop]\nlatency = \"1e-999 s\"", fragments: []string{"loop.latency", "too small", "0 for none"}},
		{name: "bare overflow", file: "[resonator]\nquality = 1e999", fragments: []string{"bench.toml, line 2, column 11"}},
		{
			name: "quoted number", file: "[resonator]\nquality = \"35\"",
			fragments: []string{`resonator.quality = "35"`, "a number is needed, without unit or quotes"},
		},
		{name: "unit on a bare number", file: "[wells]\nbarrier = \"4 kT\"", fragments: []string{"wells.barrier", "a number in kT is needed"}},
		{name: "boolean for a number", file: "[resonator]\nquality = true", fragments: []string{"resonator.quality = true", "a number is needed"}},
		{name: "boolean for a count", file: "[run]\nseed = true", fragments: []string{"run.seed = true", "whole number"}},
		{name: "boolean for a quantity", file: "[loop]\nlatency = false", fragments: []string{"loop.latency = false", "a time is needed"}},
		{
			name: "unknown word", set: "loop.jitter_shape=gaussian",
			fragments: []string{`loop.jitter_shape = "gaussian"`, `"uniform" or "normal" or "exponential"`},
		},
		{name: "number for a word", file: "[loop]\nkeep_threshold = 1", fragments: []string{"loop.keep_threshold = 1", `"off" or "midpoint"`}},
		{name: "no sense", set: "sensor.sense=0", fragments: []string{"sensor.sense = 0", "1 or -1"}},
		{name: "bits without a range", set: "sensor.bits=12", fragments: []string{"sensor.bits = 12", "sensor.range", "2·range/2^bits"}},
		{name: "half a bit", set: "sensor.bits=1.5", fragments: []string{"sensor.bits", "whole number"}},
		{name: "certain loss", set: "loop.lost_ticks=1", fragments: []string{"loop.lost_ticks", "at least 0 and below 1"}},
		{name: "no gain", set: "sensor.gain_error=-1", fragments: []string{"sensor.gain_error", "above -1 and at most 10"}},
		{
			name: "nothing passes", file: "[sensor]\nbandwidth = \"1 MHz\"\nhigh_pass = \"2 MHz\"",
			fragments: []string{"sensor.high_pass", "sensor.bandwidth", "below the bandwidth"},
		},
		{
			name: "late by its lags", file: "[loop]\nlatency = \"10 us\"\n[output]\nlag = \"12 us\"",
			fragments: []string{"loop.latency", "22 us with the lags", "--beyond-range"},
		},
		{name: "list", file: "[loop]\nlatency = [\"1 us\"]", fragments: []string{"loop.latency", "a time is needed"}},
		{name: "date", file: "[resonator]\nquality = 1979-05-27", fragments: []string{"resonator.quality = 1979-05-27", "a number is needed"}},
		{name: "fractional count", file: "[run]\nseed = 3.7", fragments: []string{"run.seed = 3.7", "whole number"}},
		{name: "count with a point", file: "[run]\nseed = 3.0", fragments: []string{"run.seed", "whole number"}},
		{name: "quoted count", file: "[run]\nseed = \"3\"", fragments: []string{"run.seed", "whole number"}},
		{name: "negative count", file: "[run]\nseed = -1", fragments: []string{"run.seed = -1", "allowed: at least 0"}},
		{name: "leading zero", file: "[run]\nseed = 010", fragments: []string{"bench.toml, line 2, column 8", "leading zero"}},
		{name: "null", file: "[run]\nseed = null", fragments: []string{"bench.toml, line 2, column 8"}},
		{name: "nothing", file: "[run]\nseed =\n", fragments: []string{"bench.toml, line 2"}},
		{name: "empty text", file: "[loop]\nlatency = \"\"", fragments: []string{"loop.latency = \"\"", "decimal number and a unit"}},
		{name: "NaN", file: "[resonator]\nquality = nan", fragments: []string{"resonator.quality = NaN", "allowed: 0.001 to 1000000"}},
		{name: "infinity", file: "[wells]\ntilt = -inf", fragments: []string{"wells.tilt = -Inf", "allowed: any finite value"}},
		{name: "NaN with a unit", file: "[loop]\nlatency = \"nan s\"", fragments: []string{"loop.latency", "decimal number"}},
		{
			name: "quoted path", file: "\"loop.latency\" = \"1 us\"\n[loop]\nlatency = \"2 us\"",
			fragments: []string{`"loop.latency"`, "one name, not a path", "latency under [loop]"},
		},
		{name: "quoted path alone", file: "\"loop.latency\" = \"1 us\"", fragments: []string{"one name, not a path"}},
		{
			name: "section in other letter case", file: "[loop]\nlatency = \"1 us\"\n[Loop]\nlatency = \"2 us\"",
			fragments: []string{"unknown section [Loop]", "nearest known name is [loop]"},
		},
		{
			name: "key in other letter case", file: "[loop]\nlatency = \"1 us\"\nLatency = \"2 us\"",
			fragments: []string{"unknown key loop.Latency", "bench.toml", "nearest known name is loop.latency"},
		},
		{name: "duplicate", file: "[loop]\nlatency = \"1 us\"\nlatency = \"2 us\"", fragments: []string{"bench.toml, line 3, column 1", "latency"}},
		{name: "duplicate section", file: "[loop]\n[loop]\n", fragments: []string{"bench.toml, line 2", "loop"}},
		{name: "broken", file: "[resonator]\nquality = 35 36", fragments: []string{"bench.toml, line 2, column 14"}},
		{name: "key for a section", file: "loop = 3", fragments: []string{"loop = 3", "loop is a section"}},
		{name: "sections in a list", file: "[[loop]]\nlatency = \"1 us\"", fragments: []string{"loop", "is a section"}},
		{name: "section for a key", file: "[loop.latency]\nx = 1", fragments: []string{"loop.latency is a key, not a section"}},
		{name: "unknown section", file: "[resonater]\nquality = 3", fragments: []string{"[resonater]", "bench.toml", "[resonator]"}},
		{name: "unknown key", file: "[resonator]\nqualty = 3", fragments: []string{"unknown key resonator.qualty", "bench.toml", "resonator.quality"}},
		{name: "unknown subsection", file: "[resonator.qualty]\nx = 3", fragments: []string{"unknown key resonator.qualty", "resonator.quality"}},
		{name: "key without its section", file: "quality = 3", fragments: []string{"unknown key quality", "resonator.quality"}},

		// The environment and --set.
		{
			name: "unknown variable", env: "BRINKWELL_SET_LOOP_HALFBAND=1 nm",
			fragments: []string{"BRINKWELL_SET_LOOP_HALFBAND", "nearest known name is BRINKWELL_SET_LOOP_HALF_BAND"},
		},
		{
			name: "variable in small letters", env: "BRINKWELL_SET_loop_latency=1 us",
			fragments: []string{"BRINKWELL_SET_loop_latency", "nearest known name is BRINKWELL_SET_LOOP_LATENCY"},
		},
		{name: "prefix in small letters", env: "brinkwell_set_loop_latency=1 us", fragments: []string{"BRINKWELL_SET_LOOP_LATENCY"}},
		{name: "empty variable", env: "BRINKWELL_SET_LOOP_LATENCY=", fragments: []string{"loop.latency", "BRINKWELL_SET_LOOP_LATENCY", "a time"}},
		{name: "empty bare variable", env: "BRINKWELL_SET_RESONATOR_QUALITY=", fragments: []string{"resonator.quality", "a number is needed"}},
		{
			name: "no number", env: "BRINKWELL_SET_RESONATOR_QUALITY=high",
			fragments: []string{`resonator.quality = "high"`, "BRINKWELL_SET_RESONATOR_QUALITY", "a number is needed"},
		},
		{name: "unknown key set", set: "loop.latncy=1 us", fragments: []string{"unknown key loop.latncy", "--set", "loop.latency"}},
		{name: "key set in other letter case", set: "Loop.Latency=1 us", fragments: []string{"unknown key Loop.Latency", "is loop.latency"}},
		{name: "no value", set: "loop.latency", fragments: []string{"--set \"loop.latency\"", "key=value"}},
		{name: "quotes", set: `loop.latency="1 us"`, fragments: []string{"loop.latency", "--set", "leave the quotes out"}},
		{name: "quoted number set", set: `resonator.quality="35"`, fragments: []string{"resonator.quality", "without unit or quotes"}},
		{name: "number set without unit", set: "loop.latency=1e-6", fragments: []string{"loop.latency", "needs a unit"}},
		{name: "unit on a number set", set: "wells.barrier=4 kT", fragments: []string{"wells.barrier", "a number in kT is needed"}},
		{name: "boolean set", set: "resonator.quality=true", fragments: []string{"resonator.quality", "a number is needed"}},
		{name: "NaN set", set: "resonator.quality=nan", fragments: []string{"resonator.quality", "a number is needed"}},
		{name: "infinity set", set: "resonator.quality=Inf", fragments: []string{"resonator.quality", "a number is needed"}},
		{name: "overflow set", set: "resonator.quality=1e999", fragments: []string{"resonator.quality", "too large"}},
		{name: "underflow set", set: "wells.tilt=1e-999", fragments: []string{"wells.tilt", "too small"}},
		{name: "octal number set", set: "resonator.quality=010", fragments: []string{"resonator.quality", "not a decimal number"}},
		{name: "octal count set", set: "run.seed=010", fragments: []string{"run.seed", "whole number"}},
		{name: "hexadecimal set", set: "run.seed=0x10", fragments: []string{"run.seed", "whole number"}},
		{name: "separated number set", set: "resonator.quality=1_000", fragments: []string{"resonator.quality", "not a decimal number"}},
		{name: "separated count set", set: "run.seed=1_000", fragments: []string{"run.seed", "whole number"}},
		{name: "fractional count set", set: "run.seed=3.7", fragments: []string{"run.seed", "whole number"}},
		{name: "count set with an exponent", set: "run.seed=1e3", fragments: []string{"run.seed", "whole number"}},
		{name: "count set too large", set: "run.seed=9223372036854775808", fragments: []string{"run.seed", "9223372036854775807"}},

		// Ranges.
		{name: "quality 0", set: "resonator.quality=0", fragments: []string{"resonator.quality", `"0"`, "allowed: 0.001 to 1000000"}},
		{name: "quality below 0", file: "[resonator]\nquality = -3", fragments: []string{"resonator.quality = -3", "allowed: 0.001 to 1000000"}},
		{name: "quality above", set: "resonator.quality=1.1e6", fragments: []string{"resonator.quality", "out of range"}},
		{name: "frequency", set: "resonator.frequency=0 Hz", fragments: []string{"resonator.frequency", "allowed: 1 mHz to 10 GHz"}},
		{name: "stiffness", set: "resonator.stiffness=-0.08 N/m", fragments: []string{"resonator.stiffness", "allowed: 1 pN/m to 1 GN/m"}},
		{name: "temperature", set: "resonator.temperature=0 K", fragments: []string{"resonator.temperature", "allowed: 1 uK to 100000 K"}},
		{name: "barrier", set: "wells.barrier=0", fragments: []string{"wells.barrier", "allowed: 0.1 kT to 100 kT"}},
		{name: "distance 0", set: "wells.distance=0 nm", fragments: []string{"wells.distance", "allowed: above 0 m"}},
		{name: "rate 0", set: "loop.rate=0 Hz", fragments: []string{"loop.rate", "allowed: above 0 Hz and at most 1 THz"}},
		{name: "rate above", set: "loop.rate=2 THz", fragments: []string{"loop.rate", "at most 1 THz"}},
		{name: "half band", set: "loop.half_band=-1 pm", fragments: []string{"loop.half_band", "allowed: at least 0 m"}},
		{name: "latency", set: "loop.latency=-1 us", fragments: []string{"loop.latency", "allowed: at least 0 s"}},
		{name: "noise", set: "sensor.noise=-1 fm/rtHz", fragments: []string{"sensor.noise", "allowed: at least 0 m/rtHz"}},
		{name: "duration", set: "run.duration=0 s", fragments: []string{"run.duration", "allowed: above 0 s"}},
		{name: "warm-up", set: "run.warm_up=-1 s", fragments: []string{"run.warm_up", "allowed: at least 0 s"}},
		{name: "tolerance 0", set: "tolerance.barrier=0", fragments: []string{"tolerance.barrier", "allowed: above 0 and at most 10"}},
		{name: "tolerance above", set: "tolerance.temperature=11", fragments: []string{"tolerance.temperature", "at most 10"}},

		// Settings that contradict each other.
		{
			name: "both twins in the file", file: "[wells]\nbarrier = 4\ndistance = \"1 nm\"",
			fragments: []string{"wells.barrier (bench.toml) and wells.distance (bench.toml)", "state one of them"},
		},
		{
			name: "twins across sections", file: "[wells]\ntilt = 0\n[loop]\nthreshold = \"0 m\"",
			fragments: []string{"loop.threshold", "wells.tilt", "state one of them"},
		},
		{
			name: "distance for no barrier", set: "wells.distance=1 m",
			fragments: []string{`wells.distance = "1 m"`, "kT; allowed: 0.1 to 100 kT", "201.2 pm to 6.362 nm"},
		},
		{name: "distance so small that its barrier is 0", set: "wells.distance=1e-290 ym", fragments: []string{"wells.distance", "a barrier of 0 kT"}},
		{name: "distance so large that its barrier overflows", set: "wells.distance=1e290 km", fragments: []string{"wells.distance", "+Inf kT"}},
		{
			name: "threshold beyond the well", set: "loop.threshold=-0.7 nm",
			fragments: []string{`loop.threshold = "-700 pm"`, `loop.half_band = "20 pm"`, "720 pm", "636.2 pm", "half the well distance"},
		},
		{name: "band beyond the well", set: "loop.half_band=1 nm", fragments: []string{"wells.tilt = 0", `loop.half_band = "1 nm"`, "636.2 pm"}},
		{
			name: "band up to the well", file: "[wells]\ndistance = \"2 nm\"\n[loop]\nhalf_band = \"1 nm\"",
			fragments: []string{"up to 1 nm", "half the well distance"},
		},
		{name: "tilt beyond the well", set: "wells.tilt=-16", fragments: []string{"wells.tilt = -16", "|tilt| below 4·barrier, 16 kT"}},
		{name: "slow loop", set: "loop.rate=30 kHz", fragments: []string{`loop.rate = "30 kHz"`, "4.62 ticks", "period", "153.8 us", "39 kHz or more"}},
		{
			name: "late loop", set: "loop.latency=50 us",
			fragments: []string{`loop.latency = "50 us"`, "1/8", "19.23 us", "self-oscillate", "--beyond-range"},
		},
		{name: "less than a tick", set: "run.duration=0.4 us", fragments: []string{`run.duration = "400 ns"`, "0.4 ticks", "allowed: 1 to 1e+15 ticks"}},
		{name: "too many ticks", set: "run.duration=1e10 s", fragments: []string{"run.duration", "1e+16 ticks", "loop.rate"}},
		{name: "too long a warm-up", set: "run.warm_up=1e10 s", fragments: []string{"run.warm_up", "1e+16 ticks"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			var src Sources
			if tt.env != "" {
				src.Environ = []string{tt.env}
			}
			if tt.set != "" {
				src.Set = []string{tt.set}
			}
			s, err := reload(tt.file, src)
			if err == nil {
				t.Fatalf("it was accepted: %+v", s)
			}
			if s != (Settings{}) {
				t.Errorf("settings beside the error: %+v", s)
			}
			checkMessage(t, err, 1, tt.fragments)
		})
	}
}

// checkMessage checks the lines of an error and what it must hold.
func checkMessage(t *testing.T, err error, lines int, fragments []string) {
	t.Helper()
	message := err.Error()
	for _, fragment := range fragments {
		if !strings.Contains(message, fragment) {
			t.Errorf("the message lacks %q:\n%s", fragment, message)
		}
	}
	split := strings.Split(message, "\n")
	if len(split) != lines {
		t.Errorf("%d lines, want %d:\n%s", len(split), lines, message)
	}
	for _, line := range split {
		if !strings.HasPrefix(line, "settings: ") {
			t.Errorf("a line without its prefix: %s", line)
		}
	}
}

func TestDuplicateAssignments(t *testing.T) {
	_, err := load(nil, Sources{Set: []string{"resonator.quality=1", "resonator.quality=2"}})
	checkMessage(t, err, 1, []string{`resonator.quality = "2"`, "--set", `stated twice; before it as "1"`})
	_, err = load(nil, Sources{Environ: []string{"BRINKWELL_SET_RUN_SEED=1", "BRINKWELL_SET_RUN_SEED=1"}})
	checkMessage(t, err, 1, []string{"run.seed", "BRINKWELL_SET_RUN_SEED", "stated twice"})
	_, err = load(nil, Sources{Environ: []string{"BRINKWELL_SET_WELLS_TILT=1", "BRINKWELL_SET_LOOP_THRESHOLD=0 m"}})
	checkMessage(t, err, 1, []string{"wells.tilt (BRINKWELL_SET_WELLS_TILT)", "loop.threshold (BRINKWELL_SET_LOOP_THRESHOLD)"})
}

// Every problem is found at once, in an order that does not change.
func TestEveryProblem(t *testing.T) {
	src := Sources{
		Environ: []string{"BRINKWELL_SET_NOTHING=1"},
		Set:     []string{"sensor.noise=1", "sensor.nose=1"},
	}
	const file = "[resonator]\nquality = -3\nfrequency = 6500\nstifness = 1\n"
	_, err := reload(file, src)
	checkMessage(t, err, 6, []string{
		"resonator.quality = -3", "resonator.frequency = 6500", "resonator.stifness",
		"BRINKWELL_SET_NOTHING", "sensor.noise", "sensor.nose",
	})
	for range 20 {
		if _, again := reload(file, src); again.Error() != err.Error() {
			t.Fatalf("another order:\n%v\n\n%v", err, again)
		}
	}
	_, err = load(nil, Sources{Set: []string{"loop.rate=30 kHz", "loop.latency=50 us", "wells.tilt=20"}})
	checkMessage(t, err, 3, []string{"loop.rate", "loop.latency", "wells.tilt"})
}

// The limits themselves, and the rate that a message proposes, are allowed.
func TestEdgesAreAllowed(t *testing.T) {
	tests := []struct {
		set      []string
		beyond   bool
		warnings []string // a fragment of each
	}{
		{set: []string{"loop.half_band=0 m", "loop.latency=0 s", "sensor.noise=0 m/rtHz", "run.warm_up=0 s", "run.seed=0"}},
		{set: []string{"loop.rate=39 kHz"}, warnings: []string{`loop.rate = "39 kHz": only 6 ticks`}},
		{set: []string{"loop.rate=194.9 kHz"}, warnings: []string{"195 kHz or more"}},
		{set: []string{"loop.rate=195 kHz"}},
		// Overdamped, Q = 0.01: the relaxation time is 1/(Q·omega0), 100/(2·pi·6500 Hz) = 2.449 ms.
		{set: []string{"resonator.quality=0.01", "loop.rate=12.26 kHz", "loop.latency=0.3 ms"}},
		{set: []string{"resonator.quality=0.01", "loop.rate=2.46 kHz"}, warnings: []string{"relaxation time"}},
		// At Q = 1/2 it is the period still, 153.8 us, and not twice 24.5 us.
		{set: []string{"resonator.quality=0.5", "loop.latency=19 us"}},
		{set: []string{"resonator.frequency=8 kHz", "loop.latency=15.625 us"}}, // exactly 1/8
		{set: []string{"loop.latency=50 us"}, beyond: true, warnings: []string{`loop.latency = "50 us"`}},
		{set: []string{"run.duration=1 us"}},
		{set: []string{"run.duration=1e9 s"}},
		{set: []string{"wells.tilt=15.9", "loop.half_band=0 m"}},
		{set: []string{"loop.half_band=636 pm"}},
		{set: []string{"tolerance.barrier=10", "tolerance.temperature=1e-9"}},
	}
	for _, tt := range tests {
		s, err := load(nil, Sources{Set: tt.set, BeyondRange: tt.beyond})
		if err != nil {
			t.Errorf("%v: %v", tt.set, err)
			continue
		}
		got := s.Warnings()
		if !slices.EqualFunc(got, tt.warnings, strings.Contains) {
			t.Errorf("%v: warnings %q, want %q", tt.set, got, tt.warnings)
		}
	}
	for _, set := range [][]string{
		{"resonator.quality=0.01", "loop.rate=2.44 kHz"},
		{"resonator.quality=0.01", "loop.rate=12 kHz", "loop.latency=0.31 ms"},
		{"resonator.quality=0.499", "loop.latency=7 us"}, // 1/8 of 49.1 us is 6.13 us
		{"loop.rate=38.9 kHz"},
	} {
		if _, err := load(nil, Sources{Set: set}); err == nil {
			t.Errorf("%v was accepted", set)
		}
	}
}

// The rate that a message proposes is enough.
func TestProposedRateDoes(t *testing.T) {
	for _, set := range [][]string{
		{"resonator.frequency=1.2345678 kHz", "loop.rate=1 kHz"},
		{"resonator.frequency=8.88888 mHz", "loop.rate=1 mHz"},
		{"resonator.quality=0.0123", "loop.rate=1 Hz"},
	} {
		_, err := load(nil, Sources{Set: set})
		if err == nil {
			t.Fatalf("%v was accepted", set)
		}
		_, after, _ := strings.Cut(err.Error(), "a rate of ")
		rate, _, found := strings.Cut(after, " or more")
		set[1] = "loop.rate=" + rate
		if _, err := load(nil, Sources{Set: append(set, "run.duration=1 h")}); !found || err != nil {
			t.Errorf("the proposed rate %q: %v", rate, err)
		}
	}
}

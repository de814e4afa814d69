package settings

import (
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"github.com/spf13/viper"
)

// reload loads a file's content beside other sources.
func reload(file string, src Sources) (Settings, error) {
	src.File = "bench.toml"
	return load([]byte(file), src)
}

func mustLoad(t *testing.T, file string, src Sources) Settings {
	t.Helper()
	s, err := reload(file, src)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestDemo(t *testing.T) {
	got, err := Load(Sources{})
	if err != nil {
		t.Fatal(err)
	}
	barrier, tilt := Bare(4), Bare(0)
	want := Settings{
		Resonator: Resonator{Frequency: 6500, Stiffness: 0.08, Quality: 35, Temperature: 293.15},
		Wells:     Wells{Barrier: &barrier, Tilt: &tilt},
		Loop:      Loop{Rate: 1e6, HalfBand: 0.02e-9, Latency: 1e-6, JitterShape: "normal", KeepThreshold: "off"},
		Sensor:    Sensor{Noise: 30e-15, Sense: 1, HumFrequency: 50},
		Run:       Run{Duration: 60, WarmUp: got.Run.WarmUp, Seed: 1},
		Tolerance: Tolerance{Barrier: 0.1, Temperature: 0.05},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("the demo is %+v, want %+v", got, want)
	}
	if w := got.Warnings(); len(w) > 0 {
		t.Errorf("the demo warns: %q", w)
	}
	if got.Ticks() != 60_000_000 {
		t.Errorf("Ticks() = %d, want 60 s at 1 MHz", got.Ticks())
	}
}

func TestLayers(t *testing.T) {
	const file = "[resonator]\nquality = 36\n[loop]\nhalf_band = \"0.03 nm\"\n"
	environ := []string{"HOME=/", "BRINKWELL_SET_RESONATOR_QUALITY=37", "BRINKWELL_SET_LOOP_HALF_BAND=0.04 nm", "BRINKWELL_SETTINGS=x"}
	set := []string{"resonator.quality=38", " loop.half_band = 0.05 nm"}
	tests := []struct {
		src     Sources
		file    string
		quality Bare
		band    Metre
	}{
		{Sources{}, "", 35, 0.02e-9},
		{Sources{}, file, 36, 0.03e-9},
		{Sources{Environ: environ}, file, 37, 0.04e-9},
		{Sources{Environ: environ, Set: set}, file, 38, 0.05e-9},
		{Sources{Set: set[:1]}, "", 38, 0.02e-9},
	}
	for _, tt := range tests {
		s := mustLoad(t, tt.file, tt.src)
		if s.Resonator.Quality != tt.quality || s.Loop.HalfBand != tt.band {
			t.Errorf("%+v over %q: quality %v, half band %v m; want %v and %v m",
				tt.src, tt.file, s.Resonator.Quality, float64(s.Loop.HalfBand), tt.quality, float64(tt.band))
		}
	}
}

// Every key can be set from the environment: no two share a variable.
func TestEveryKeyHasItsVariable(t *testing.T) {
	seen := map[string]string{}
	for _, k := range keys {
		if other := seen[k.variable()]; other != "" {
			t.Errorf("%s and %s share %s", other, k.name, k.variable())
		}
		seen[k.variable()] = k.name
	}
	if seen["BRINKWELL_SET_LOOP_HALF_BAND"] != "loop.half_band" {
		t.Errorf("the variables are %v", seen)
	}
}

// Every field of Settings has a row in the table of keys, and every row a field.
func TestTableFitsSettings(t *testing.T) {
	var s Settings
	for _, k := range keys {
		k.field(&s) // panics without a field
		if k.doc == "" {
			t.Errorf("%s has no comment", k.name)
		}
		if k.twin != "" && (lookup(k.twin).twin != k.name || k.said == nil) {
			t.Errorf("%s and %s are no twins", k.name, k.twin)
		}
	}
	for section := range reflect.TypeFor[Settings]().Fields() {
		for field := range section.Type.Fields() {
			name := section.Tag.Get("mapstructure") + "." + field.Tag.Get("mapstructure")
			if lookup(name) == nil {
				t.Errorf("the field %s.%s has no row %s", section.Name, field.Name, name)
			}
		}
	}
}

func TestLaterTwinWins(t *testing.T) {
	const distance = "[wells]\ndistance = \"2 nm\"\n"
	const threshold = "[loop]\nthreshold = \"0.1 nm\"\n"

	s := mustLoad(t, distance+threshold, Sources{})
	if s.Wells.Barrier != nil || s.Wells.Tilt != nil || s.DistanceM() != 2e-9 || s.ThresholdM() != 0.1e-9 {
		t.Errorf("the file did not win over the demo: %+v", s)
	}
	s = mustLoad(t, distance+threshold, Sources{Environ: []string{"BRINKWELL_SET_WELLS_BARRIER=5"}, Set: []string{"wells.tilt=1"}})
	if s.Wells.Distance != nil || s.Loop.Threshold != nil || s.BarrierKT() != 5 || s.TiltKT() != 1 {
		t.Errorf("later layers did not win over the file: %+v", s)
	}
	s = mustLoad(t, "[wells]\nbarrier = 5\n", Sources{Set: []string{"wells.distance=2 nm"}})
	if s.Wells.Barrier != nil || s.DistanceM() != 2e-9 {
		t.Errorf("--set did not win over the file: %+v", s)
	}
}

// Both ways of stating the wells and the threshold agree. The figures are the
// formulas B = k·x1²/2 and tilt = 2·k·x1·x0 worked by hand: with T = 1/1.380649
// kK, kT is 1e-20 J; k = 0.02 N/m and x1 = 2 nm give B = 4e-20 J, and x0 = 0.25
// nm gives a tilt of 2e-20 J. The tolerance is a few roundings.
func TestDerived(t *testing.T) {
	base := []string{"resonator.temperature=724.297051603992 K", "resonator.stiffness=0.02 N/m"}
	for _, more := range [][]string{
		{"wells.barrier=4", "wells.tilt=2"},
		{"wells.distance=4 nm", "wells.tilt=2"},
		{"wells.barrier=4", "loop.threshold=0.25 nm"},
		{"wells.distance=4 nm", "loop.threshold=0.25 nm"},
	} {
		s := mustLoad(t, "", Sources{Set: append(more, base...)})
		for _, c := range []struct {
			name      string
			got, want float64
		}{
			{"KT", s.KT(), 1e-20},
			{"HalfDistance", s.HalfDistance(), 2e-9},
			{"DistanceM", s.DistanceM(), 4e-9},
			{"BarrierKT", s.BarrierKT(), 4},
			{"TiltKT", s.TiltKT(), 2},
			{"ThresholdM", s.ThresholdM(), 0.25e-9},
		} {
			if !(math.Abs(c.got-c.want) <= 4e-15*c.want) {
				t.Errorf("%v: %s() = %v, want %v", more, c.name, c.got, c.want)
			}
		}
	}
}

// The warm-up that is not stated is 20·max(Q, 1/Q)/omega0; omega0 is 1000/s here,
// but for one rounding of 2·pi and the 17 digits of the frequency.
func TestWarmUp(t *testing.T) {
	const thousand = "resonator.frequency=159.15494309189535 Hz"
	tests := []struct {
		set  []string
		want float64 // s
	}{
		{[]string{thousand, "resonator.quality=50"}, 1},
		{[]string{thousand, "resonator.quality=0.02"}, 1},
		{[]string{thousand, "resonator.quality=1"}, 0.02},
		{[]string{thousand, "run.warm_up=0 s"}, 0},
		{[]string{thousand, "run.warm_up=2 min"}, 120},
	}
	for _, tt := range tests {
		s := mustLoad(t, "", Sources{Set: tt.set})
		if !(math.Abs(float64(s.Run.WarmUp)-tt.want) <= 1e-15*tt.want) {
			t.Errorf("%v: a warm-up of %v s, want %v s", tt.set, float64(s.Run.WarmUp), tt.want)
		}
	}
	if s := mustLoad(t, "", Sources{Set: []string{"run.warm_up=1.5 us"}}); s.WarmUpTicks() != 2 {
		t.Errorf("a warm-up of 1.5 ticks is %d ticks, want 2", s.WarmUpTicks())
	}
}

func TestTicksAreWhole(t *testing.T) {
	// 0.3·1e6 and 1.1·1e6 are not whole in binary; the last two are not whole at all.
	for text, want := range map[string]int64{"0.3 s": 300_000, "1.1 s": 1_100_000, "1.4 us": 1, "1.6 us": 2} {
		if s := mustLoad(t, "", Sources{Set: []string{"run.duration=" + text}}); s.Ticks() != want {
			t.Errorf("%s at 1 MHz is %d ticks, want %d", text, s.Ticks(), want)
		}
	}
}

func TestNumbersAreReadAsWritten(t *testing.T) {
	tests := []struct {
		file, set string
		quality   Bare
		seed      Count
	}{
		{"[resonator]\nquality = 50", "", 50, 1},
		{"[resonator]\nquality = 1_000", "", 1000, 1}, // as TOML has it
		{"[run]\nseed = 0x10", "", 35, 16},            // as TOML has it
		{"[run]\nseed = 9223372036854775807", "", 35, math.MaxInt64},
		{"", "run.seed=9007199254740993", 35, 1<<53 + 1},
		{"", "resonator.quality=5e1", 50, 1},
		{"resonator.quality = 50\r\n", "", 50, 1},
		{"\ufeff[resonator]\nquality = 50", "", 50, 1},
		{"resonator = { quality = 50 }", "", 50, 1},
	}
	for _, tt := range tests {
		var src Sources
		if tt.set != "" {
			src.Set = []string{tt.set}
		}
		s := mustLoad(t, tt.file, src)
		if s.Resonator.Quality != tt.quality || s.Run.Seed != tt.seed {
			t.Errorf("%q %q: quality %v, seed %d; want %v, %d",
				tt.file, tt.set, s.Resonator.Quality, s.Run.Seed, tt.quality, tt.seed)
		}
	}
	s := mustLoad(t, "[wells]\ntilt = -0.0\n[loop]\nlatency = \"-0 s\"", Sources{})
	if math.Signbit(float64(*s.Wells.Tilt)) || math.Signbit(float64(s.Loop.Latency)) {
		t.Error("a zero kept its minus sign")
	}
}

func TestLoadReadsTheFile(t *testing.T) {
	dir := t.TempDir()
	name := filepath.Join(dir, "mine.toml")
	if err := os.WriteFile(name, []byte("[resonator]\nquality = 50\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if s, err := Load(Sources{File: name}); err != nil || s.Resonator.Quality != 50 {
		t.Errorf("Load gives a quality of %v, %v; want 50", s.Resonator.Quality, err)
	}
	large := filepath.Join(dir, "large.toml")
	if err := os.WriteFile(large, []byte(strings.Repeat("#", maxFileSize+1)), 0o600); err != nil {
		t.Fatal(err)
	}
	for path, want := range map[string]string{
		filepath.Join(dir, "none.toml"): "none.toml",
		dir:                             "directory",
		large:                           "not a settings file",
	} {
		if _, err := Load(Sources{File: path}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("Load(%s): %v; want an error with %q", path, err, want)
		}
	}
}

func TestNearest(t *testing.T) {
	for name, want := range map[string]string{
		"resonator.qualty":    "resonator.quality",
		"Resonator.Quality":   "resonator.quality",
		"quality":             "resonator.quality",
		"loop.quality":        "resonator.quality",
		"loop.halfband":       "loop.half_band",
		"loop.barrier":        "wells.barrier or tolerance.barrier",
		"resonator.frequnecy": "resonator.frequency",
		"resonator.freq":      "resonator.frequency",
	} {
		if got := nearest(name, names()); got != want {
			t.Errorf("the nearest to %s is %s, want %s", name, got, want)
		}
	}
}

// The distances are those of textbooks.
func TestEdits(t *testing.T) {
	for _, tt := range []struct {
		a, b string
		want int
	}{{"", "", 0}, {"", "abc", 3}, {"kitten", "sitting", 3}, {"sunday", "saturday", 3}, {"ab", "ba", 2}} {
		if got, back := edits(tt.a, tt.b), edits(tt.b, tt.a); got != tt.want || back != tt.want {
			t.Errorf("%q to %q: %d and back %d edits, want %d", tt.a, tt.b, got, back, tt.want)
		}
	}
}

// The decoder itself, should a value ever reach it without the hook, does not
// turn true into 1 or text into a number, nor drop a key.
func TestDecoderForgivesNothing(t *testing.T) {
	for name, value := range map[string]any{"resonator.quality": true, "run.seed": "3", "run.sed": 3.0} {
		v := viper.New()
		v.Set(name, value)
		var s Settings
		err := v.UnmarshalExact(&s, viper.DecodeHook(decode), strictly)
		if err == nil {
			t.Errorf("%s = %v was decoded: %+v", name, value, s)
			continue
		}
		if found := problems(err); len(found) != 1 || !strings.Contains(found[0].Error(), "settings: ") {
			t.Errorf("%s = %v: %v", name, value, found)
		}
	}
}

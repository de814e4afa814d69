package settings

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func written(t interface{ Fatal(...any) }, s Settings) string {
	var b strings.Builder
	if err := s.WriteTOML(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// logUniform draws from a range of many decades.
func logUniform(t *rapid.T, low, high float64, label string) float64 {
	v := math.Exp(rapid.Float64Range(math.Log(low), math.Log(high)).Draw(t, label))
	return min(max(v, low), high)
}

// randomSettings draws settings that contradict each other nowhere.
func randomSettings(t *rapid.T) Settings {
	var s Settings
	s.Resonator = Resonator{
		Frequency:   Hertz(logUniform(t, 1e-3, 1e10, "frequency")),
		Stiffness:   NewtonPerMetre(logUniform(t, 1e-12, 1e9, "stiffness")),
		Quality:     Bare(logUniform(t, 1e-3, 1e6, "quality")),
		Temperature: Kelvin(logUniform(t, 1e-6, 1e5, "temperature")),
	}
	barrier := Bare(logUniform(t, 0.11, 99, "barrier"))
	s.Wells.Barrier = &barrier
	if rapid.Bool().Draw(t, "by distance") {
		distance := Metre(s.DistanceM())
		s.Wells = Wells{Distance: &distance}
	}
	place := rapid.Float64Range(-0.9, 0.9).Draw(t, "threshold") // in half distances
	if rapid.Bool().Draw(t, "by threshold") {
		threshold := Metre(place * s.HalfDistance())
		s.Loop.Threshold = &threshold
	} else {
		tilt := Bare(place * 4 * s.BarrierKT())
		s.Wells.Tilt = &tilt
	}
	per, _ := s.characteristic()
	s.Loop.Rate = min(1e12, Hertz(per*logUniform(t, 7, min(99, 1e12/per), "ticks")))
	s.Loop.HalfBand = Metre(rapid.Float64Range(0, 0.05).Draw(t, "half band") * s.HalfDistance())
	s.Loop.Latency = Second(rapid.Float64Range(0, 0.12).Draw(t, "latency") / per)
	s.Loop.Jitter = Second(rapid.Float64Min(0).Draw(t, "jitter"))
	s.Loop.JitterShape = Choice(rapid.SampledFrom([]string{"uniform", "normal", "exponential"}).Draw(t, "shape"))
	s.Loop.LostTicks = Bare(rapid.Float64Range(0, 0.999).Draw(t, "lost ticks"))
	s.Loop.HoldOff = Second(rapid.Float64Min(0).Draw(t, "hold-off"))
	s.Loop.KeepThreshold = Choice(rapid.SampledFrom([]string{"off", "midpoint"}).Draw(t, "keep"))
	s.Sensor = Sensor{
		Noise:        MetrePerRootHertz(rapid.Float64Min(0).Draw(t, "noise")),
		Bandwidth:    Hertz(per * logUniform(t, 1e3, 1e6, "bandwidth")),
		HighPass:     Hertz(per * logUniform(t, 1e-9, 1e2, "high-pass")),
		Bits:         Count(rapid.Int64Range(0, 48).Draw(t, "bits")),
		Range:        Metre(logUniform(t, 1e-15, 1, "range")),
		Offset:       Metre(rapid.Float64().Draw(t, "offset")),
		Drift:        MetrePerSecond(rapid.Float64().Draw(t, "drift")),
		GainError:    Bare(rapid.Float64Range(-0.9, 10).Draw(t, "gain error")),
		Sense:        Count(rapid.SampledFrom([]int{-1, 1}).Draw(t, "sense")),
		Sticks:       Bare(rapid.Float64Range(0, 0.999).Draw(t, "sticks")),
		HumAmplitude: Metre(rapid.Float64Min(0).Draw(t, "hum")),
		HumFrequency: Hertz(logUniform(t, 1e-3, 1e9, "hum frequency")),
	}
	s.Output.Lag = Second(rapid.Float64Range(0, 0.004).Draw(t, "lag") / per)
	s.Run = Run{
		Duration: Second(logUniform(t, 1, 9e14, "run") / float64(s.Loop.Rate)),
		WarmUp:   Second(rapid.Float64Range(0, 9e14).Draw(t, "warm-up") / float64(s.Loop.Rate)),
		Seed:     Count(rapid.Int64Min(0).Draw(t, "seed")),
	}
	s.Tolerance = Tolerance{
		Barrier:     Bare(logUniform(t, 1e-300, 10, "tolerance of the barrier")),
		Temperature: Bare(logUniform(t, 1e-300, 10, "tolerance of the temperature")),
	}
	return s
}

// What is written loads as the same settings, to the last bit.
func TestWriteTOMLCanBeLoaded(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := randomSettings(t)
		file := written(t, want)
		got, err := reload(file, Sources{})
		if err != nil {
			t.Fatalf("%v, of the file\n%s", err, file)
		}
		if !reflect.DeepEqual(got, want) {
			t.Fatalf("%+v was loaded, %+v written", got, want)
		}
	})
}

func TestWriteTOMLOfTheDemo(t *testing.T) {
	s, err := Load(Sources{})
	if err != nil {
		t.Fatal(err)
	}
	name := filepath.Join(t.TempDir(), "demo.toml")
	if err := os.WriteFile(name, []byte(written(t, s)), 0o600); err != nil {
		t.Fatal(err)
	}
	again, err := Load(Sources{File: name})
	if err != nil || !reflect.DeepEqual(again, s) {
		t.Errorf("the demo is loaded as %+v, %v; want %+v", again, err, s)
	}
}

func TestWriteTOMLTellsMeanings(t *testing.T) {
	s := mustLoad(t, "", Sources{})
	file := written(t, s)
	for _, want := range []string{
		"\nfrequency = \"6.5 kHz\"\n",
		"\nbarrier = 4\n",
		"Here wells.barrier = 4 is the same as distance = \"1.272 nm\"\n",
		"Here wells.tilt = 0 is the same as threshold = \"0 m\"\n",
		"strictly above threshold + half_band",
		"after the instant at which its position was sampled",
		"one-sided density",
		"noise·sqrt(rate/2)",
		"20·max(quality, 1/quality)/omega0",
		"# Allowed: 0.001 to 1000000.\nquality = 35\n",
	} {
		if !strings.Contains(file, want) {
			t.Errorf("the file lacks %q:\n%s", want, file)
		}
	}
	for _, line := range strings.Split(file, "\n") {
		if len([]rune(line)) > 110 {
			t.Errorf("a line of %d characters: %s", len([]rune(line)), line)
		}
	}
	s = mustLoad(t, "", Sources{Set: []string{"wells.distance=2 nm", "loop.threshold=0.1 nm"}})
	file = written(t, s)
	for _, want := range []string{
		"\ndistance = \"2 nm\"\n", "is the same as barrier = 9.883\n",
		"\nthreshold = \"100 pm\"\n", "is the same as tilt = 3.953\n",
	} {
		if !strings.Contains(file, want) {
			t.Errorf("the file lacks %q:\n%s", want, file)
		}
	}
}

// A bare number is short, and a large one is not a TOML integer, which would
// have to fit into 64 bits.
func TestBareText(t *testing.T) {
	for want, v := range map[string]float64{
		"0": 0, "35": 35, "-1.5": -1.5, "0.001": 1e-3, "1000000": 1e6, "1e-300": 1e-300, "1e+15": 1e15, "1e+19": 1e19,
	} {
		if got := bareText(v); got != want {
			t.Errorf("%v is written %s, want %s", v, got, want)
		}
	}
}

type fullDisk struct{}

var errFull = errors.New("no space left")

func (fullDisk) Write([]byte) (int, error) { return 0, errFull }

func TestWriteTOMLFails(t *testing.T) {
	if err := mustLoad(t, "", Sources{}).WriteTOML(fullDisk{}); !errors.Is(err, errFull) {
		t.Errorf("WriteTOML: %v, want %v", err, errFull)
	}
}

// Any file is loaded or refused, and what is loaded can be written and loaded.
func FuzzLoad(f *testing.F) {
	for _, file := range []string{
		"",
		"[resonator]\nquality = 35\nfrequency = \"6.5 kHz\"",
		"\"loop.latency\" = \"1 us\"\n[loop]\nlatency = \"2 us\"",
		"[wells]\ndistance = \"1 nm\"\n[loop]\nthreshold = \"0.1 nm\"",
		"[run]\nseed = 010",
		"[loop]\nrate = nan\n[[loop]]\n",
		"resonator = { quality = 1979-05-27 }",
		"[a.b.\"c.d\"]\n\"\" = []",
		"\ufeff[Loop]\r\n",
	} {
		f.Add([]byte(file))
	}
	f.Fuzz(func(t *testing.T, file []byte) {
		s, err := load(file, Sources{File: "bench.toml"})
		if err != nil {
			return
		}
		again, err := load([]byte(written(t, s)), Sources{})
		if err != nil || !reflect.DeepEqual(again, s) {
			t.Fatalf("%+v was loaded, then %+v, %v", s, again, err)
		}
	})
}

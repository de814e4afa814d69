package plant_test

import (
	"math"
	"strings"
	"testing"

	"brinkwell/controller/trace"
	"brinkwell/plant"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

const rate = 1e6 // Hz

// paddle is the resonator of these tests: 154 ticks a period.
func paddle(quality float64) motion.Oscillator {
	return motion.Oscillator{Omega0: 2 * math.Pi * 6500, Quality: quality, Stiffness: 0.08, KT: 4.0474e-21}
}

// config is a bench of 2 kT with noise and a latency that is no whole number
// of ticks.
func config() plant.Config {
	o := paddle(35)
	x1 := 2 * math.Sqrt(o.KT/o.Stiffness)
	return plant.Config{
		Oscillator: o,
		Rate:       rate,
		Centres:    [trace.Levels]float64{-x1, x1},
		Latency:    2.5 / rate,
		Sensor:     chain.White(0.02*x1, rate),
		Seed:       1,
	}
}

func newPlant(t testing.TB, c plant.Config) *plant.Plant {
	t.Helper()
	p, err := plant.New(c)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// closed runs p under a comparator without a band, and tells see each sample.
func closed(t testing.TB, p *plant.Plant, threshold float64, ticks int64, see func(tick int64, s *trace.Sample)) {
	t.Helper()
	level := p.Level()
	for tick := range ticks {
		var s trace.Sample
		if err := p.Sense(tick, &s); err != nil {
			t.Fatal(err)
		}
		s.Level = trace.Lower
		if s.Measured > threshold {
			s.Level = trace.Upper
		}
		if s.Level != level {
			level = s.Level
			if err := p.Actuate(tick, level); err != nil {
				t.Fatal(err)
			}
		}
		see(tick, &s)
	}
}

func TestBadConfigIsRefused(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		name string
		want string // in the error
		set  func(c *plant.Config)
	}{
		{"rate zero", "rate", func(c *plant.Config) { c.Rate = 0 }},
		{"rate negative", "rate", func(c *plant.Config) { c.Rate = -1 }},
		{"rate infinite", "rate", func(c *plant.Config) { c.Rate = inf }},
		{"rate not a number", "rate", func(c *plant.Config) { c.Rate = nan }},
		{"latency negative", "latency", func(c *plant.Config) { c.Latency = -1e-9 }},
		{"latency not a number", "latency", func(c *plant.Config) { c.Latency = nan }},
		{"latency infinite", "latency", func(c *plant.Config) { c.Latency = inf }},
		{"latency of 17 million ticks", "latency", func(c *plant.Config) { c.Latency = 17 }},
		{"noise negative", "noise", func(c *plant.Config) { c.Sensor.Density = -1e-12 }},
		{"noise not a number", "noise", func(c *plant.Config) { c.Sensor.Density = nan }},
		{"noise infinite", "noise", func(c *plant.Config) { c.Sensor.Density = inf }},
		{"wells swapped", "well", func(c *plant.Config) { c.Centres = [trace.Levels]float64{1e-9, -1e-9} }},
		{"wells in one place", "well", func(c *plant.Config) { c.Centres = [trace.Levels]float64{} }},
		{"a well not a number", "well", func(c *plant.Config) { c.Centres[trace.Upper] = nan }},
		{"a well at infinity", "well", func(c *plant.Config) { c.Centres[trace.Upper] = inf }},
		{"a well at minus infinity", "well", func(c *plant.Config) { c.Centres[trace.Lower] = -inf }},
		{"threshold not a number", "threshold", func(c *plant.Config) { c.Threshold = nan }},
		{"threshold above both wells", "threshold", func(c *plant.Config) { c.Threshold = 1.1 * c.Centres[trace.Upper] }},
		{"threshold below both wells", "threshold", func(c *plant.Config) { c.Threshold = 1.1 * c.Centres[trace.Lower] }},
	} {
		t.Run(c.name, func(t *testing.T) {
			bad := config()
			c.set(&bad)
			p, err := plant.New(bad)
			if err == nil || p != nil {
				t.Fatalf("New gave a plant: %t, error: %v; want an error alone", p != nil, err)
			}
			if !strings.HasPrefix(err.Error(), "plant: ") || !strings.Contains(err.Error(), c.want) {
				t.Errorf("error %q does not name the %s", err, c.want)
			}
		})
	}
}

// A tick of the loop that the plant sees, actuations included, allocates
// nothing; comparing noisy positions with 0 makes some chatter.
func TestTicksDoNotAllocate(t *testing.T) {
	for _, latency := range []float64{0, 0.3, 2.5} {
		c := config()
		c.Latency = latency / rate
		p := newPlant(t, c)
		events := make([]trace.Event, 0, 256)
		var s trace.Sample
		tick, actuations := int64(0), 0
		level := p.Level()
		if a := testing.AllocsPerRun(200, func() {
			for range 100 {
				_ = p.Sense(tick, &s)
				if want := trace.Level(tick / 3 % 2); want != level {
					level = want
					actuations++
					_ = p.Actuate(tick, level)
				}
				tick++
			}
			events = p.Acted(events[:0])
		}); a != 0 {
			t.Errorf("latency of %g ticks: %v allocations per 100 ticks, want 0", latency, a)
		}
		if actuations < 1000 {
			t.Errorf("only %d actuations were tried", actuations)
		}
	}
}

// The second of two equal runs is the first; another seed is another run.
func TestSeedDeterminesTheRun(t *testing.T) {
	type run struct {
		samples []trace.Sample
		events  []trace.Event
	}
	record := func(seed uint64) run {
		c := config()
		c.Seed = seed
		p := newPlant(t, c)
		var r run
		closed(t, p, 0, 20_000, func(_ int64, s *trace.Sample) { r.samples = append(r.samples, *s) })
		r.events = p.Acted(nil)
		return r
	}
	a, b, other := record(7), record(7), record(8)
	for i := range a.samples {
		if a.samples[i] != b.samples[i] {
			t.Fatalf("tick %d: %+v, then %+v of the same seed", i, a.samples[i], b.samples[i])
		}
		if a.samples[i].Position == other.samples[i].Position || a.samples[i].Measured == other.samples[i].Measured {
			t.Errorf("tick %d: two seeds give the same number", i)
		}
	}
	if len(a.events) < 10 || len(a.events) != len(b.events) {
		t.Fatalf("%d, then %d events of the same seed, want the same ten or more", len(a.events), len(b.events))
	}
	for i := range a.events {
		if a.events[i] != b.events[i] {
			t.Fatalf("event %d: %+v, then %+v of the same seed", i, a.events[i], b.events[i])
		}
	}
}

// The runs of one seed with and without sensor noise, decided alike, are the
// same motion: the streams are separate.
func TestNoiseDoesNotMoveTheResonator(t *testing.T) {
	quiet, noisy := config(), config()
	quiet.Sensor.Density = 0
	a, b := newPlant(t, quiet), newPlant(t, noisy)
	for tick := range int64(5000) {
		var sa, sb trace.Sample
		_, _ = a.Sense(tick, &sa), b.Sense(tick, &sb)
		if tick%50 == 0 {
			level := trace.Level(tick / 50 % 2)
			_, _ = a.Actuate(tick, level), b.Actuate(tick, level)
		}
		if sa.Position != sb.Position || sa.Velocity != sb.Velocity {
			t.Fatalf("tick %d: sensor noise changed the motion", tick)
		}
		if sa.Measured != sa.Position {
			t.Fatalf("tick %d: a sensor without noise reads %g m at %g m", tick, sa.Measured, sa.Position)
		}
	}
}

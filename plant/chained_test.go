package plant_test

import (
	"context"
	"math"
	"testing"

	"brinkwell/controller"
	"brinkwell/controller/effect"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
	"brinkwell/plant"
	"brinkwell/plant/chain"
)

// Imperfections too small to matter give the plain plant's run: the same
// levels, and positions off by what they are.
func TestVanishingImperfections(t *testing.T) {
	plain, small := config(), config()
	small.Sensor.Bandwidth = 1e12
	small.Lag = 1e-9 / rate
	small.Jitter, small.Shape = 1e-9/rate, chain.Normal
	small.Sensor.Density, plain.Sensor.Density = 0, 0 // behind a pole noise is no longer white
	small.Sensor.Converter = chain.Converter{Bits: 48, Range: 1e-6}
	a, b := newPlant(t, plain), newPlant(t, small)
	var x, levels []float64
	closed(t, a, 0, 100000, func(_ int64, s *trace.Sample) { x, levels = append(x, s.Position), append(levels, float64(s.Level)) })
	changes := 0
	closed(t, b, 0, 100000, func(tick int64, s *trace.Sample) {
		if float64(s.Level) != levels[tick] {
			t.Fatalf("tick %d: level %v, want %v", tick, s.Level, levels[tick])
		}
		if tick > 0 && levels[tick] != levels[tick-1] {
			changes++
		}
		// 1e-6 of the wells' distance: what the table of instants is good to.
		if !(math.Abs(s.Position-x[tick]) < 1e-6*2*plain.Centres[trace.Upper]) {
			t.Fatalf("tick %d: position %v, want %v", tick, s.Position, x[tick])
		}
	})
	if changes < 10 {
		t.Fatalf("%d changes of level, want enough to compare", changes)
	}
	// The work of a lagging centre is taken along the expected path within the
	// tick, the event's position is drawn about it: some 1e-3 kT apart, at random.
	for i, e := range b.Acted(nil) {
		if want := -2 * plain.Oscillator.Stiffness * plain.Centres[trace.Upper] * e.Level.Sign() * e.Position; !(math.Abs(e.Work-want) < 5e-3*plain.Oscillator.KT) {
			t.Errorf("event %d: work %v, want %v", i, e.Work, want)
		}
	}
}

// everything is a bench with everything wrong a little.
func everything() plant.Config {
	c := config()
	c.Sensor.Bandwidth, c.Sensor.HighPass = 200e3, 0.01
	c.Sensor.GainError, c.Sensor.Sticks = 0.01, 0.02
	c.Sensor.HumAmplitude, c.Sensor.HumFrequency = 0.01*c.Centres[trace.Upper], 50
	c.Sensor.Converter = chain.Converter{Bits: 12, Range: 10 * c.Centres[trace.Upper]}
	c.Lag = 1.5e-6
	c.Jitter, c.Shape = 0.7e-6, chain.Exponential
	c.LostTicks = 0.05
	return c
}

// Whatever is wrong with the chain, the work of the actuations is what keeps
// the resonator off the bath's temperature: m·<v²>/kT = 1 + Q·P/(omega0·kT).
// It checks the work of a lagging centre in noise.
func TestEnergyBalanceWithEverythingWrong(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	t.Parallel()
	c := everything()
	p := newPlant(t, c)
	o, err := effect.New(effect.Reference{
		Rate: rate, Oscillator: c.Oscillator, HalfDistance: c.Centres[trace.Upper], SensorNoise: 1e-12, LostTicks: true,
	})
	if err != nil {
		t.Fatal(err)
	}
	l := controller.New(controller.Config{Sensor: p, Actuator: p, Comparator: switching.Comparator{HalfBand: 0.05 * c.Centres[trace.Upper]}, Truth: true})
	if _, err := l.Run(context.Background(), 8e6, o); err != nil {
		t.Fatal(err)
	}
	r := o.Result()
	if i := r.Identity; !i.Holds() || !(i.FromPower.High < 0.95) {
		t.Errorf("%v and %v, %v standard errors apart; want them equal, and well below 1", i.Kinetic, i.FromPower, i.Sigmas)
	}
	if m := r.Crossings.MeasuredOvershoot; !m.Known() {
		t.Errorf("no measured overshoot: %v", m.Reason)
	}
}

// A lost tick has no reading, decides nothing, and comes as often as asked.
func TestLostTicks(t *testing.T) {
	c := config()
	c.LostTicks = 0.2
	p := newPlant(t, c)
	lost, before := 0, p.Level()
	comparator := switching.Comparator{Level: before}
	const n = 50000
	for tick := range int64(n) {
		var s trace.Sample
		if err := p.Sense(tick, &s); err != nil {
			t.Fatal(err)
		}
		level := comparator.Decide(s.Measured)
		if math.IsNaN(s.Measured) {
			lost++
			if level != before {
				t.Fatalf("tick %d is lost and decides %v", tick, level)
			}
		}
		if level != before {
			if err := p.Actuate(tick, level); err != nil {
				t.Fatal(err)
			}
		}
		before = level
	}
	if share := float64(lost) / n; !(math.Abs(share-0.2) < 3.5*math.Sqrt(0.2*0.8/n)) {
		t.Errorf("%v of the ticks are lost, want 0.2", share)
	}
	for _, e := range p.Acted(nil) {
		if math.IsNaN(e.Measured) || math.IsNaN(e.Position) {
			t.Errorf("event %+v is not a number", e)
		}
	}
}

func TestChainedPlantDoesNotAllocate(t *testing.T) {
	p := newPlant(t, everything())
	l := controller.New(controller.Config{Sensor: p, Actuator: p, Comparator: switching.Comparator{}})
	if _, err := l.Run(context.Background(), 1<<16); err != nil {
		t.Fatal(err)
	}
	if a := testing.AllocsPerRun(20, func() { _, _ = l.Run(context.Background(), 4096) }); a != 0 {
		t.Errorf("%v allocations in 4,096 ticks", a)
	}
}

func BenchmarkChained(b *testing.B) {
	p := newPlant(b, everything())
	l := controller.New(controller.Config{Sensor: p, Actuator: p, Comparator: switching.Comparator{}})
	for b.Loop() {
		if _, err := l.Run(context.Background(), 1<<16); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.N)*(1<<16)/b.Elapsed().Seconds()/1e6, "Mticks/s")
}

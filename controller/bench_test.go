package controller_test

import (
	"context"
	"fmt"
	"math"
	"testing"

	"brinkwell/controller"
	"brinkwell/controller/effect"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
	"brinkwell/plant"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// A bench is a loop closed on a simulated resonator, in reduced units: length
// σ = √(kT/k), time 1/ω₀, energy kT. The wells lie at ±√(2·barrier).
type bench struct {
	quality, barrier float64
	dt               float64 // of a tick
	latency          float64 // ticks
	band             float64 // half the dead band
	noise            float64 // of one sample
	threshold        float64
	seed             uint64
}

func (b bench) centre() float64 { return math.Sqrt(2 * b.barrier) }

func (b bench) oscillator() motion.Oscillator {
	return motion.Oscillator{Omega0: 1, Quality: b.quality, Stiffness: 1, KT: 1}
}

func (b bench) plant(t testing.TB) *plant.Plant {
	t.Helper()
	a := b.centre()
	p, err := plant.New(plant.Config{
		Oscillator: b.oscillator(),
		Rate:       1 / b.dt,
		Centres:    [trace.Levels]float64{trace.Lower: -a, trace.Upper: a},
		Threshold:  b.threshold,
		Latency:    b.latency * b.dt,
		Sensor:     chain.White(b.noise, 1/b.dt),
		Seed:       b.seed,
	})
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func (b bench) loop(t testing.TB) *controller.Loop {
	t.Helper()
	p := b.plant(t)
	return controller.New(controller.Config{
		Sensor:     p,
		Actuator:   p,
		Comparator: switching.Comparator{Threshold: b.threshold, HalfBand: b.band},
		Truth:      true,
	})
}

// run warms up for 20·max(Q, 1/Q) and gives the sink the ticks after.
func (b bench) run(t testing.TB, ticks int64, sinks ...trace.Sink) {
	t.Helper()
	l := b.loop(t)
	ctx := context.Background()
	if _, err := l.Run(ctx, int64(20*max(b.quality, 1/b.quality)/b.dt)); err != nil {
		t.Fatal(err)
	}
	if _, err := l.Run(ctx, ticks, sinks...); err != nil {
		t.Fatal(err)
	}
}

// The sums of a meter's row.
const (
	sumAbs      = iota // |x - threshold|
	sumSquare          // x²
	sumVelocity        // v²
	sumUpper           // ticks above the threshold
	sumEvents
	sumWork // U_new - U_old, the potential made continuous at the threshold
	sumBins // bins of a quarter σ about the threshold
	sumAll  = sumBins + 2*bins

	bins = 24 // on either side
)

const (
	blockTicks = 1024 // of the loop
	batches    = 64
)

// A meter sums over batches of a run that are long against its memory: their
// scatter gives the errors, whatever the correlations within.
type meter struct {
	bench  bench
	blocks int64 // a batch
	taken  int64
	rows   [batches][sumAll]float64
}

// newMeter makes a meter for about the given number of ticks, and returns the
// exact number.
func newMeter(b bench, ticks int64) (m *meter, exact int64) {
	m = &meter{bench: b, blocks: ticks / blockTicks / batches}
	return m, m.blocks * blockTicks * batches
}

func (m *meter) Take(b *trace.Block) error {
	if len(b.Samples) != blockTicks {
		return fmt.Errorf("a block of %d ticks", len(b.Samples))
	}
	row := &m.rows[m.taken/m.blocks]
	m.taken++
	var sumX, sumXX, sumVV float64
	upper := 0
	x0 := m.bench.threshold
	for i := range b.Samples {
		x, v := b.Samples[i].Position, b.Samples[i].Velocity
		d := x - x0
		sumX += math.Abs(d)
		sumXX += x * x
		sumVV += v * v
		if d > 0 {
			upper++
		}
		if k := int(math.Floor(4*d)) + bins; k >= 0 && k < 2*bins {
			row[sumBins+k]++
		}
	}
	row[sumAbs] += sumX
	row[sumSquare] += sumXX
	row[sumVelocity] += sumVV
	row[sumUpper] += float64(upper)
	for _, e := range b.Events {
		row[sumEvents]++
		row[sumWork] -= 2 * m.bench.centre() * e.Level.Sign() * (e.Position - x0)
	}
	return nil
}

// mean returns the mean over the ticks of what f makes of a batch's sums, and
// its standard error from the scatter of the batches.
func (m *meter) mean(f func(row *[sumAll]float64) float64) (mean, se float64) {
	var sum, squares float64
	ticks := float64(m.blocks * blockTicks)
	for i := range m.rows {
		y := f(&m.rows[i]) / ticks
		sum += y
		squares += y * y
	}
	mean = sum / batches
	return mean, math.Sqrt((squares/batches - mean*mean) / (batches - 1))
}

func (m *meter) of(k int) (mean, se float64) {
	return m.mean(func(row *[sumAll]float64) float64 { return row[k] })
}

// near checks a value against a true one that is known within its own standard
// error (0 for a formula). The limit of four is Student's t for 64 batches
// beyond which one value in 6,000 lies.
func near(t *testing.T, name string, got, se, want, wantSE float64) {
	t.Helper()
	both := math.Hypot(se, wantSE)
	z := (got - want) / both
	t.Logf("%-22s %.6g ± %.2g, expected %.6g: %+.2f standard errors", name, got, se, want, z)
	if !(math.Abs(z) < 4) {
		t.Errorf("%s is %.6g ± %.2g, want %.6g ± %.2g: off by %.1f standard errors", name, got, se, want, wantSE, z)
	}
}

// The demo's bench: a silicon-nitride paddle of 6.5 kHz, 1 MHz loop.
func demo(b *testing.B, noise, band bool, latency float64, holdOff int64, keep bool) (*controller.Loop, *effect.Observer) {
	const boltzmann, temperature, rate = 1.380649e-23, 293.15, 1e6
	o := motion.Oscillator{Omega0: 2 * math.Pi * 6500, Quality: 35, Stiffness: 0.08, KT: boltzmann * temperature}
	x1 := math.Sqrt(2 * 4 * o.KT / o.Stiffness)
	c := plant.Config{
		Oscillator: o,
		Rate:       rate,
		Centres:    [trace.Levels]float64{-x1, x1},
		Latency:    latency,
		Seed:       1,
	}
	comparator := switching.Comparator{}
	if noise {
		c.Sensor.Density = 30e-15
	}
	if band {
		comparator.HalfBand = 0.02e-9
	}
	p, err := plant.New(c)
	if err != nil {
		b.Fatal(err)
	}
	observer, err := effect.New(effect.Reference{Rate: rate, Oscillator: o, HalfDistance: x1, SensorNoise: 30e-15 * math.Sqrt(rate/2)})
	if err != nil {
		b.Fatal(err)
	}
	var keeper *switching.Keeper
	if keep {
		if keeper, err = switching.NewKeeper(switching.KeeperConfig{TimeConstant: rate, Bound: x1, Unvisited: rate}); err != nil {
			b.Fatal(err)
		}
	}
	return controller.New(controller.Config{
		Sensor: p, Actuator: p, Comparator: comparator, HoldOff: holdOff, Keeper: keeper, Truth: true,
	}), observer
}

func BenchmarkLoop(b *testing.B) {
	onOff := map[bool]string{true: "on", false: "off"}
	for _, c := range []struct {
		noise, band, effect bool
		latency             float64 // s
	}{
		{true, true, false, 1e-6},
		{true, true, true, 1e-6},
		{true, true, false, 2.5e-6},
		{false, false, false, 0},
	} {
		name := fmt.Sprintf("noise=%s/band=%s/latency=%gus/effect=%s", onOff[c.noise], onOff[c.band], c.latency*1e6, onOff[c.effect])
		b.Run(name, func(b *testing.B) {
			const ticks = 1 << 20
			l, observer := demo(b, c.noise, c.band, c.latency, 0, false)
			var sinks []trace.Sink
			if c.effect {
				sinks = append(sinks, observer)
			}
			b.ReportAllocs()
			for b.Loop() {
				if _, err := l.Run(context.Background(), ticks, sinks...); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(b.N)*ticks/1e6/b.Elapsed().Seconds(), "Mticks/s")
		})
	}
}

func BenchmarkHeldLoop(b *testing.B) {
	for _, c := range []struct {
		name    string
		holdOff int64
		keep    bool
	}{{"holdoff=off/keep=off", 0, false}, {"holdoff=on/keep=off", 10, false}, {"holdoff=on/keep=on", 10, true}} {
		b.Run(c.name, func(b *testing.B) {
			const ticks = 1 << 20
			l, _ := demo(b, true, true, 1e-6, c.holdOff, c.keep)
			b.ReportAllocs()
			for b.Loop() {
				if _, err := l.Run(context.Background(), ticks); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(b.N)*ticks/1e6/b.Elapsed().Seconds(), "Mticks/s")
		})
	}
}

package controller_test

import (
	"context"
	"math"
	"testing"

	"brinkwell/controller"
	"brinkwell/controller/effect"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
	"brinkwell/plant"
)

// A drifting sensor is a plant's whose zero moves at a steady rate from tick 0.
type drifting struct {
	*plant.Plant
	rate float64 // a tick
}

func (d drifting) Sense(tick int64, s *trace.Sample) error {
	err := d.Plant.Sense(tick, s)
	s.Measured += d.rate * float64(max(tick, 0))
	return err
}

// A long run is the demo's bench (6.5 kHz, Q 35, 4 kT, 1 MHz, latency 1 us,
// 30 fm/√Hz, half a band of 0.02 nm) over half a minute, in units of σ and
// 1/ω0.
type longRun struct {
	threshold float64 // wanted
	drift     float64 // of the zero over the run
	keep      bool
	expected  bool // whether the keeper is told of the ideal midpoint
}

const (
	longTicks = 30_000_000
	longDwell = 0.025 // s, of the longer side, from the unkept run: see below
)

func (r longRun) bench() bench {
	return bench{
		quality: 35, barrier: 4, dt: 2 * math.Pi * 6500 / 1e6,
		latency: 1, noise: 0.0943, band: 0.0889, threshold: r.threshold, seed: 77,
	}
}

func (r longRun) keeperConfig() switching.KeeperConfig {
	b := r.bench()
	c := switching.ProposeKeeper(switching.Wells{
		Rate: 1 / b.dt, Omega0: 1, Quality: b.quality, Sigma: 1,
		HalfDistance: b.centre(), Threshold: b.threshold, Dwell: longDwell * 1e6 * b.dt,
	})
	if !r.expected {
		c.ExpectedMidpoint = 0
	}
	return c
}

// What a long run shows: of the potential by true positions, and how far the
// threshold was from where the drifting zero wants it.
type longResult struct {
	effect     effect.Result
	state      switching.KeeperState
	mean, sd   float64 // of that distance, after five time constants
	squareMean float64
}

func (r longRun) run(t *testing.T) longResult {
	t.Helper()
	b := r.bench()
	p := b.plant(t)
	c := controller.Config{
		Sensor: drifting{p, r.drift / longTicks}, Actuator: p, Truth: true,
		Comparator: switching.Comparator{Threshold: b.threshold, HalfBand: b.band},
		First:      -100_000,
	}
	config := r.keeperConfig()
	if r.keep {
		k, err := switching.NewKeeper(config)
		if err != nil {
			t.Fatal(err)
		}
		c.Keeper = k
	}
	l := controller.New(c)
	o, err := effect.New(effect.Reference{Rate: 1 / b.dt, Oscillator: b.oscillator(), HalfDistance: b.centre(), Threshold: b.threshold, SensorNoise: b.noise})
	if err != nil {
		t.Fatal(err)
	}
	var n, sum, squares float64
	watch := sinkFunc(func(block *trace.Block) error {
		if float64(block.Start) >= 5*config.TimeConstant {
			d := l.Threshold().Travel - r.drift*float64(block.Start+blockTicks)/longTicks
			n++
			sum += d
			squares += d * d
		}
		return nil
	})
	ctx := context.Background()
	if _, err := l.Run(ctx, 100_000); err != nil {
		t.Fatal(err)
	}
	if _, err := l.Run(ctx, longTicks, o, watch); err != nil {
		t.Fatal(err)
	}
	out := longResult{effect: o.Result(), state: l.Threshold(), mean: sum / n}
	out.sd = math.Sqrt(squares/n - out.mean*out.mean)
	w := out.effect.Realised
	t.Logf("%+v: T %.3g s tilt %v barrier %v barriers %v T_kin %v dwell %v\n  off by %.5f ± %.5f sigma; %+v", r, config.TimeConstant/1e6,
		w.Tilt, w.Barrier, w.Barriers, w.KineticTemperature, out.effect.Crossings.MeanDwells, out.mean, out.sd, out.state)
	return out
}

func TestExplore(t *testing.T) {
	for _, r := range []longRun{{}, {keep: true}, {drift: 0.5}, {drift: 0.5, keep: true}, {threshold: 0.2, keep: true}, {threshold: 0.2, keep: true, expected: true}, {threshold: 0.2}} {
		r.run(t)
	}
}

// Package trial assembles one bench from plain values, runs it and makes its
// report.
//
// It knows loops, plants, effects and predictions; where the values come from
// and where the report goes is its users' matter.
package trial

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"brinkwell/controller"
	"brinkwell/controller/effect"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
	"brinkwell/plant"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// A Config is one bench, in SI units. Zero means none for every imperfection.
type Config struct {
	Oscillator   motion.Oscillator
	Temperature  float64 // of the bath, K; for the report, the energy is Oscillator.KT
	HalfDistance float64 // from the midpoint to either well, m
	Threshold    float64 // from the midpoint, m
	Rate         float64 // ticks, 1/s
	HalfBand     float64 // half the comparator's dead band, m
	Latency      float64 // mean, from a sample to the actuation that it decides, s
	Jitter       float64 // standard deviation of the latency, s
	Shape        chain.Shape
	LostTicks    float64            // probability
	HoldOff      float64            // after a decision, s
	KeepMidpoint bool               // whether the threshold follows the midpoint of the two mean positions
	Sensor       chain.SensorConfig // its Rate is set from Rate
	Lag          float64            // time constant of the output, s
	Duration     float64            // measured, without WarmUp, s
	WarmUp       float64            // s
	Seed         uint64
	Tolerance    Tolerance
}

// A Tolerance is what the realised potential may be off, relative to what was
// asked.
type Tolerance struct {
	Barrier     float64
	Temperature float64
}

// sensor is the sensor at the bench's rate.
func (c Config) sensor() chain.SensorConfig {
	s := c.Sensor
	s.Rate = c.Rate
	return s
}

// SensorNoise is the standard deviation of one sample, m: of the noise behind
// the sensor's poles, and of the rounding to whole converter steps, step²/12
// (W.R. Bennett, Bell Syst. Tech. J. 27, 446 (1948)).
func (c Config) SensorNoise() float64 {
	return math.Hypot(c.sensor().NoiseSD(), c.Sensor.Converter.Step()/math.Sqrt(12))
}

// Ticks is the measured number of ticks.
func (c Config) Ticks() int64 { return int64(math.Round(c.Duration * c.Rate)) }

// warmUpTicks come before the measured ones.
func (c Config) warmUpTicks() int64 { return int64(math.Ceil(c.WarmUp * c.Rate)) }

// sigma is the thermal width of one well, m.
func (c Config) sigma() float64 { return math.Sqrt(c.Oscillator.KT / c.Oscillator.Stiffness) }

// barrier is that of the untilted wells, kT.
func (c Config) barrier() float64 {
	a := c.HalfDistance / c.sigma()
	return a * a / 2
}

// A Trial is a bench that is ready to run once. It must be made by New.
type Trial struct {
	config    Config
	loop      *controller.Loop
	observer  *effect.Observer
	album     *effect.Album // nil where no pictures are wanted
	predicted *Predicted
}

// New assembles a bench.
func New(c Config) (*Trial, error) {
	if c.Ticks() < 1 {
		return nil, fmt.Errorf("trial: a duration of %g s at %g Hz is less than one tick", c.Duration, c.Rate)
	}
	p, err := plant.New(plant.Config{
		Oscillator: c.Oscillator,
		Rate:       c.Rate,
		Centres:    [trace.Levels]float64{trace.Lower: -c.HalfDistance, trace.Upper: c.HalfDistance},
		Threshold:  c.Threshold,
		Latency:    c.Latency,
		Jitter:     c.Jitter,
		Shape:      c.Shape,
		Lag:        c.Lag,
		LostTicks:  c.LostTicks,
		Sensor:     c.Sensor,
		Seed:       c.Seed,
	})
	if err != nil {
		return nil, err
	}
	observer, err := effect.New(c.reference())
	if err != nil {
		return nil, err
	}
	predicted := c.predict()
	keeper, err := c.keeper(predicted)
	if err != nil {
		return nil, err
	}
	loop := controller.New(controller.Config{
		Sensor:     p,
		Actuator:   p,
		Comparator: switching.Comparator{Threshold: c.Threshold, HalfBand: c.HalfBand},
		HoldOff:    int64(math.Ceil(c.HoldOff * c.Rate)),
		Keeper:     keeper,
		Truth:      true,
		First:      -c.warmUpTicks(),
	})
	return &Trial{config: c, loop: loop, observer: observer, predicted: predicted}, nil
}

// reference is what the effect is stated against.
func (c Config) reference() effect.Reference {
	return effect.Reference{
		Rate:         c.Rate,
		Oscillator:   c.Oscillator,
		HalfDistance: c.HalfDistance,
		Threshold:    c.Threshold,
		SensorNoise:  c.SensorNoise(),
		SensorCorner: c.Sensor.Bandwidth,
		LostTicks:    c.LostTicks > 0,
	}
}

// WithPictures makes the report hold what pictures show, too. It is called
// before Run.
func (t *Trial) WithPictures() error {
	var err error
	t.album, err = effect.NewAlbum(t.config.reference())
	return err
}

// keeper makes what lets the threshold follow the sensor's zero, nil where it
// stays.
func (c Config) keeper(p *Predicted) (*switching.Keeper, error) {
	if !c.KeepMidpoint {
		return nil, nil
	}
	dwell := math.Max(p.MeanDwellLower, p.MeanDwellUpper)
	if dwell == 0 {
		return nil, fmt.Errorf("trial: the threshold cannot follow the midpoint: how long a well keeps the resonator is not known for this bench (%s)", strings.Join(p.OutsideBecause, "; "))
	}
	k, err := switching.NewKeeper(switching.ProposeKeeper(switching.Wells{
		Rate:         c.Rate,
		Omega0:       c.Oscillator.Omega0,
		Quality:      c.Oscillator.Quality,
		Sigma:        c.sigma(),
		HalfDistance: c.HalfDistance,
		Threshold:    c.Threshold,
		Dwell:        dwell,
	}))
	if err != nil {
		return nil, fmt.Errorf("trial: the threshold cannot follow the midpoint: %w", err)
	}
	return k, nil
}

// Progress is told of the ticks done, warm-up included, and their total.
type Progress func(done, total int64)

// Run warms up, measures and reports. When ctx ends it reports what there is,
// Report.Interrupted set. A sink that fails is given nothing more, and its
// error is returned beside the report; any other error means that there is no
// report.
func (t *Trial) Run(ctx context.Context, progress Progress, sinks ...trace.Sink) (Report, error) {
	c := t.config
	warm, ticks := c.warmUpTicks(), c.Ticks()
	p := newProgressSink(progress, warm+ticks)
	if _, err := t.loop.Run(ctx, warm, p); err != nil && !errors.Is(err, context.Canceled) {
		return Report{}, err
	}
	start := time.Now()
	return t.measure(ctx, start, p, sinks, func(sinks ...trace.Sink) (int64, error) {
		return t.loop.Run(ctx, ticks, sinks...)
	})
}

// Reread makes the report of a run that was recorded: replay gives the
// recorded blocks to sinks and returns how many ticks they had. What the
// recording does not hold, the threshold's travel, is missing.
func (t *Trial) Reread(ctx context.Context, progress Progress, replay func(sinks ...trace.Sink) (int64, error)) (Report, error) {
	r, err := t.measure(ctx, time.Now(), newProgressSink(progress, t.config.Ticks()), nil, replay)
	r.Loop.ThresholdTravel = nil
	return r, err
}

// measure gives a run's blocks to what makes the report, and makes it.
func (t *Trial) measure(ctx context.Context, start time.Time, p *progressSink, sinks []trace.Sink, run func(sinks ...trace.Sink) (int64, error)) (Report, error) {
	all := []trace.Sink{t.observer, p}
	if t.album != nil {
		all = append(all, t.album)
	}
	guests := make([]*guest, len(sinks))
	for i, s := range sinks {
		guests[i] = &guest{sink: s}
		all = append(all, guests[i])
	}
	done, err := run(all...)
	interrupted := errors.Is(err, context.Canceled) || ctx.Err() != nil
	if err != nil && !interrupted {
		return Report{}, err
	}
	r := t.report(done, time.Since(start))
	r.Interrupted = interrupted
	if t.album != nil {
		r.Pictures = t.pictures(t.album)
	}
	for _, g := range guests {
		if g.err != nil {
			return r, g.err
		}
	}
	return r, nil
}

// A guest is a sink whose failure does not end the run.
type guest struct {
	sink trace.Sink
	err  error
}

func (g *guest) Take(b *trace.Block) error {
	if g.err == nil {
		g.err = g.sink.Take(b)
	}
	return nil
}

// progressSink tells how far a run is.
type progressSink struct {
	tell        Progress
	done, total int64
}

func newProgressSink(tell Progress, total int64) *progressSink {
	if tell == nil {
		tell = func(int64, int64) {}
	}
	return &progressSink{tell: tell, total: total}
}

func (p *progressSink) Take(b *trace.Block) error {
	p.done += int64(len(b.Samples))
	p.tell(p.done, p.total)
	return nil
}

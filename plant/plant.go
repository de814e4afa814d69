// Package plant is what a loop controls: the resonator in its two parabolas,
// seen through an imperfect sensor and driven by levels that act a latency
// after the sample that decided them.
//
// A Plant is the Sensor and the Actuator of a bench; it knows nothing of who
// decides.
package plant

import (
	"fmt"
	"math"

	"brinkwell/controller/trace"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// A Config says what a Plant is made of. Zero means none for every
// imperfection.
type Config struct {
	Oscillator motion.Oscillator
	Rate       float64               // ticks, 1/s
	Centres    [trace.Levels]float64 // of each level's parabola, m
	Threshold  float64               // where the potential is continuous, m; for energies and the first draw
	Sensor     chain.SensorConfig    // its Rate is set from Rate
	Latency    float64               // mean, from a sample to the actuation that it decides, s
	Jitter     float64               // standard deviation of the latency, s
	Shape      chain.Shape           // of the jitter
	Lag        float64               // time constant with which a centre follows its level, s
	LostTicks  float64               // probability that a tick has no sample
	Seed       uint64
}

// Streams of the seed.
const (
	streamThermal = iota
	streamWithin
	streamSensor
	streamStart
	streamPoles
	streamSticks
	streamDelay
	streamLost
)

func (c Config) validate() error {
	switch {
	case !(c.Rate > 0) || math.IsInf(c.Rate, 0):
		return fmt.Errorf("plant: rate %g Hz, want a positive number", c.Rate)
	case !(c.LostTicks >= 0 && c.LostTicks < 1):
		return fmt.Errorf("plant: a tick is lost with probability %g, want 0 to below 1", c.LostTicks)
	case !(c.Centres[trace.Lower] < c.Centres[trace.Upper]) ||
		math.IsInf(c.Centres[trace.Lower], 0) || math.IsInf(c.Centres[trace.Upper], 0):
		return fmt.Errorf("plant: wells at %g m and %g m, want finite positions with the upper level's above the lower's", c.Centres[trace.Lower], c.Centres[trace.Upper])
	case !(c.Threshold > c.Centres[trace.Lower] && c.Threshold < c.Centres[trace.Upper]):
		return fmt.Errorf("plant: threshold at %g m, want it between the wells, at %g m and %g m", c.Threshold, c.Centres[trace.Lower], c.Centres[trace.Upper])
	}
	if err := c.Sensor.Validate(); err != nil {
		return fmt.Errorf("plant: %w", err)
	}
	return nil
}

// plain reports whether the resonator alone is stepped: nothing lags, levels
// act at one instant of a tick, and the reading is position and white noise.
func (c Config) plain() bool {
	return c.Sensor.Plain() && c.Jitter == 0 && c.Lag == 0 && c.LostTicks == 0
}

// A Plant is a simulated bench. It must be made by New and must not be used
// by two goroutines at once. It does not allocate once it runs, as long as
// Acted is called every 1,024 ticks.
type Plant struct {
	resonator *resonator.Resonator // of a plain plant; otherwise chained has it
	bath      *resonator.Bath
	within    *variate.Normal // for positions between ticks
	split     resonator.Split // the instant in a tick at which levels act
	chained   *chained        // nil for a plain plant
	started   bool

	noise *variate.Normal
	seen  []float64 // sensor noise of the next ticks, m
	next  int       // of seen
	sd    float64   // m

	level trace.Level
	delay *chain.Delay
	due   int64 // tick after which the next level acts
	acted []trace.Event
	open  bool    // whether the last of acted lacks its Measured
	last  float64 // measured at the tick before, m

	centres                    [trace.Levels]float64
	rate, stiffness, threshold float64
}

// New makes a Plant in equilibrium: its first position, velocity and side are
// drawn from the Boltzmann distribution of the double well that Config asks.
func New(c Config) (*Plant, error) {
	c.Sensor.Rate = c.Rate
	if err := c.validate(); err != nil {
		return nil, err
	}
	dt := 1 / c.Rate
	stream := func(k uint64) *variate.Normal { return variate.NewNormal(c.Seed, k) }
	delay, err := chain.NewDelay(chain.DelayConfig{Rate: c.Rate, Latency: c.Latency, Jitter: c.Jitter, Shape: c.Shape}, stream(streamDelay))
	if err != nil {
		return nil, fmt.Errorf("plant: %w", err)
	}
	p := &Plant{
		bath:      resonator.NewBath(c.Oscillator, dt, stream(streamThermal)),
		within:    stream(streamWithin),
		noise:     stream(streamSensor),
		seen:      make([]float64, noiseDrawn),
		next:      noiseDrawn,
		sd:        c.Sensor.NoiseSD(),
		delay:     delay,
		due:       delay.Due(),
		acted:     make([]trace.Event, 0, 1024),
		centres:   c.Centres,
		rate:      c.Rate,
		stiffness: c.Oscillator.Stiffness,
		threshold: c.Threshold,
	}
	if !c.plain() {
		if p.chained, err = newChained(c, delay.Offset(), p.within, stream); err != nil {
			return nil, err
		}
	}
	if p.resonator, err = resonator.New(c.Oscillator, dt); err != nil {
		return nil, err
	}
	p.split = p.resonator.Split(delay.Offset())
	p.begin(c)
	return p, nil
}

// noiseDrawn samples of noise are drawn at once.
const noiseDrawn = 512

// begin draws the first state: a well by its weight, then a position of that
// well's normal distribution on its own side of the threshold.
func (p *Plant) begin(c Config) {
	n := variate.NewNormal(c.Seed, streamStart)
	o := c.Oscillator
	sigma := math.Sqrt(o.KT / o.Stiffness)
	// Weight of a side: its depth below the threshold and its share of a normal.
	upper := (c.Centres[trace.Upper] - c.Threshold) / sigma
	lower := (c.Threshold - c.Centres[trace.Lower]) / sigma
	logOdds := (upper*upper-lower*lower)/2 + math.Log(math.Erfc(-upper/math.Sqrt2)/math.Erfc(-lower/math.Sqrt2))
	share := 1 / (1 + math.Exp(-logOdds))
	p.level = trace.Lower
	if n.Float64() < share {
		p.level = trace.Upper
	}
	centre := c.Centres[p.level]
	x := centre
	for range 1000 { // at least every second draw is on its side
		x = centre + sigma*n.Next()
		if (x-c.Threshold)*p.level.Sign() > 0 {
			break
		}
	}
	v := math.Sqrt(o.KT/o.Mass()) * n.Next()
	p.resonator.Set(x, v, centre)
	if p.chained != nil {
		mean := share*c.Centres[trace.Upper] + (1-share)*c.Centres[trace.Lower]
		p.chained.mover.Set(x, v, centre, mean)
	}
}

// Level returns the level in force.
func (p *Plant) Level() trace.Level { return p.level }

// Sense advances to the next tick and fills in what is known of it. The first
// call gives the first state; ticks must follow one another.
func (p *Plant) Sense(tick int64, s *trace.Sample) error {
	if p.chained != nil {
		p.senseChained(tick, s)
		return nil
	}
	switch {
	case tick-1 == p.due:
		p.act(tick - 1)
	case p.started:
		p.resonator.Step(p.bath.Next())
	default:
		p.started = true
	}
	if p.next == len(p.seen) {
		p.look()
	}
	x := p.resonator.Position()
	s.Measured = x + p.seen[p.next]
	p.next++
	s.Position = x
	s.Velocity = p.resonator.Velocity()
	if p.open {
		e := &p.acted[len(p.acted)-1]
		e.Measured = p.last + (s.Measured-p.last)*e.Offset*p.rate
		p.open = false
	}
	p.last = s.Measured
	return nil
}

// look draws the sensor noise of the next ticks.
func (p *Plant) look() {
	p.noise.Fill(p.seen)
	for i := range p.seen {
		p.seen[i] *= p.sd
	}
	p.next = 0
}

// Actuate sends a level on its way at a tick; it acts the latency later. Of
// several levels of one tick the last holds.
func (p *Plant) Actuate(tick int64, level trace.Level) error {
	p.delay.Push(tick, level)
	p.due = p.delay.Due()
	return nil
}

// act steps from a tick to the next one while a pending level acts. With U
// continuous at x0 whatever the centre c, dU/dc = -k·(x - x0): a centre that
// jumps does the work -k·(x - x0)·Δc.
func (p *Plant) act(tick int64) {
	c := p.delay.Pop()
	p.due = p.delay.Due()
	e := trace.Event{Decided: c.Decided, Tick: tick, Offset: c.Offset, Level: c.Level}
	if c.Offset > 0 {
		e.Position = p.resonator.StepMoving(p.bath.Next(), &p.split, p.centres[c.Level], p.within)
	} else {
		e.Position = p.resonator.Position()
		p.resonator.Move(p.centres[c.Level])
		p.resonator.Step(p.bath.Next())
	}
	e.Work = -p.stiffness * (e.Position - p.threshold) * (p.centres[c.Level] - p.centres[p.level])
	p.level = c.Level
	p.acted, p.open = append(p.acted, e), true
}

// Acted appends the actuations since its last call to dst. With a lag an
// actuation is known once its centre has arrived, or another one begins.
func (p *Plant) Acted(dst []trace.Event) []trace.Event {
	dst = append(dst, p.acted...)
	p.acted = p.acted[:0]
	return dst
}

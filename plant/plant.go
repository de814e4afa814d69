// Package plant is what a loop controls: the resonator in its two parabolas,
// seen by a noisy sensor and driven by levels that act a latency after the
// sample that decided them.
//
// A Plant is the Sensor and the Actuator of a bench; it knows nothing of who
// decides.
package plant

import (
	"fmt"
	"math"

	"brinkwell/controller/trace"
	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// A Config says what a Plant is made of.
type Config struct {
	Oscillator  motion.Oscillator
	Rate        float64               // ticks, 1/s
	Centres     [trace.Levels]float64 // of each level's parabola, m
	Threshold   float64               // where the parabolas are joined, between the centres, m; for the first draw
	Latency     float64               // from a sample to the actuation that it decides, s
	SensorNoise float64               // standard deviation of one sample, m
	Seed        uint64
}

// Streams of the seed.
const (
	streamThermal = iota
	streamWithin
	streamSensor
	streamStart
)

func (c Config) validate() error {
	switch {
	case !(c.Rate > 0) || math.IsInf(c.Rate, 0):
		return fmt.Errorf("plant: rate %g Hz, want a positive number", c.Rate)
	case !(c.Latency >= 0) || !(c.Latency*c.Rate < mostPending):
		return fmt.Errorf("plant: latency %g s is %g ticks, want 0 to %d ticks", c.Latency, c.Latency*c.Rate, mostPending)
	case !(c.SensorNoise >= 0) || math.IsInf(c.SensorNoise, 0):
		return fmt.Errorf("plant: sensor noise %g m, want a finite number, not negative", c.SensorNoise)
	case math.IsInf(c.Centres[trace.Lower], 0) || math.IsInf(c.Centres[trace.Upper], 0) || !(c.Centres[trace.Lower] < c.Centres[trace.Upper]):
		return fmt.Errorf("plant: wells at %g m (lower level) and %g m (upper), want finite positions, the upper level's above the lower's",
			c.Centres[trace.Lower], c.Centres[trace.Upper])
	case !(c.Centres[trace.Lower] < c.Threshold && c.Threshold < c.Centres[trace.Upper]):
		return fmt.Errorf("plant: threshold %g m, want one between the wells at %g m and %g m",
			c.Threshold, c.Centres[trace.Lower], c.Centres[trace.Upper])
	}
	return nil
}

// mostPending bounds how many ticks long a latency may be, and with it the
// memory for actuations on their way.
const mostPending = 1 << 24

// A Plant is a simulated bench. It must be made by New and must not be used
// by two goroutines at once. It does not allocate once it runs, as long as
// Acted is called every 1,024 ticks.
type Plant struct {
	resonator *resonator.Resonator
	bath      *resonator.Bath
	within    *variate.Normal // for positions between ticks
	centres   [trace.Levels]float64
	split     resonator.Split // the instant in a tick at which levels act
	offset    float64         // that instant after the tick, s; 0: at the tick
	delay     int64           // whole ticks of the latency

	noise   *variate.Normal
	seen    []float64 // sensor noise of the next ticks, m
	next    int       // of seen
	sd      float64   // m
	level   trace.Level
	started bool

	pending []command // ring, its length a power of two
	head    int64     // next to act
	tail    int64     // next free
	due     int64     // tick of pending[head]; never where there is none
	acted   []trace.Event
	open    bool    // whether the last of acted lacks its Measured
	last    float64 // measured at the tick before, m

	rate, stiffness, threshold float64
}

// A command is a level on its way.
type command struct {
	decided int64
	level   trace.Level
}

const never = math.MaxInt64

// New makes a Plant in equilibrium: its first position, velocity and side are
// drawn from the Boltzmann distribution of the double well that Config asks.
func New(c Config) (*Plant, error) {
	if err := c.validate(); err != nil {
		return nil, err
	}
	dt := 1 / c.Rate
	r, err := resonator.New(c.Oscillator, dt)
	if err != nil {
		return nil, err
	}
	p := &Plant{
		resonator: r,
		bath:      resonator.NewBath(c.Oscillator, dt, variate.NewNormal(c.Seed, streamThermal)),
		within:    variate.NewNormal(c.Seed, streamWithin),
		centres:   c.Centres,
		noise:     variate.NewNormal(c.Seed, streamSensor),
		seen:      make([]float64, 512),
		sd:        c.SensorNoise,
		due:       never,
		rate:      c.Rate,
		stiffness: c.Oscillator.Stiffness,
		threshold: c.Threshold,
	}
	p.next = len(p.seen)
	p.delay, p.offset = wholeTicks(c.Latency, c.Rate)
	if p.offset > 0 {
		p.split = r.Split(p.offset)
	}
	ring := 2
	for int64(ring) < p.delay+2 {
		ring *= 2
	}
	p.pending = make([]command, ring)
	p.acted = make([]trace.Event, 0, 1024)
	p.begin(c)
	return p, nil
}

// wholeTicks splits a latency into whole ticks and a rest in [0, tick), s. A
// rest within rounding of a whole tick is one.
func wholeTicks(latency, rate float64) (ticks int64, rest float64) {
	const rounding = 1e-9 // ticks
	t := latency * rate
	n := math.Floor(t + rounding)
	if t-n <= rounding {
		return int64(n), 0
	}
	return int64(n), (t - n) / rate
}

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
	p.level = trace.Lower
	if n.Float64() < 1/(1+math.Exp(-logOdds)) {
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
	p.resonator.Set(x, math.Sqrt(o.KT/o.Mass())*n.Next(), centre)
}

// Level returns the level in force.
func (p *Plant) Level() trace.Level { return p.level }

// Sense advances to the next tick and fills in what is known of it. The first
// call gives the first state; ticks must follow one another.
func (p *Plant) Sense(tick int64, s *trace.Sample) error {
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
		p.measure(s.Measured)
	}
	p.last = s.Measured
	return nil
}

// measure completes the last event with what the sensor saw around it.
func (p *Plant) measure(next float64) {
	e := &p.acted[len(p.acted)-1]
	e.Measured = p.last + (next-p.last)*e.Offset*p.rate
	p.open = false
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
	if p.head < p.tail {
		if last := &p.pending[(p.tail-1)&int64(len(p.pending)-1)]; last.decided == tick {
			last.level = level
			return nil
		}
	}
	p.pending[p.tail&int64(len(p.pending)-1)] = command{decided: tick, level: level}
	if p.head == p.tail {
		p.due = tick + p.delay
	}
	p.tail++
	return nil
}

// act steps from a tick to the next one while a pending level acts. With U
// continuous at x0 whatever the centre c, dU/dc = -k·(x - x0): a centre that
// jumps does the work -k·(x - x0)·Δc.
func (p *Plant) act(tick int64) {
	mask := int64(len(p.pending) - 1)
	c := p.pending[p.head&mask]
	p.head++
	p.due = never
	if p.head < p.tail {
		p.due = p.pending[p.head&mask].decided + p.delay
	}
	e := trace.Event{Decided: c.decided, Tick: tick, Offset: p.offset, Level: c.level}
	if p.offset > 0 {
		e.Position = p.resonator.StepMoving(p.bath.Next(), &p.split, p.centres[c.level], p.within)
	} else {
		e.Position = p.resonator.Position()
		p.resonator.Move(p.centres[c.level])
		p.resonator.Step(p.bath.Next())
	}
	e.Work = -p.stiffness * (e.Position - p.threshold) * (p.centres[c.level] - p.centres[p.level])
	p.level = c.level
	p.acted, p.open = append(p.acted, e), true
}

// Acted appends the actuations since its last call to dst.
func (p *Plant) Acted(dst []trace.Event) []trace.Event {
	dst = append(dst, p.acted...)
	p.acted = p.acted[:0]
	return dst
}

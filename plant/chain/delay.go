package chain

import (
	"fmt"
	"math"

	"brinkwell/controller/trace"
	"brinkwell/plant/variate"
)

// A Shape is the distribution of a latency about its mean.
type Shape string

// The shapes; Jitter is the standard deviation of each. They are cut where the
// latency would be negative.
const (
	Uniform     Shape = "uniform"     // within √3 of Jitter on either side
	Normal      Shape = "normal"      // Gaussian
	Exponential Shape = "exponential" // from Latency - Jitter on, with a tail to longer ones
)

// Shapes are all of them.
var Shapes = []Shape{Uniform, Normal, Exponential}

// A DelayConfig is how late commanded levels act.
type DelayConfig struct {
	Rate    float64 // ticks, 1/s
	Latency float64 // mean, before it is cut, s
	Jitter  float64 // standard deviation, before it is cut, s
	Shape   Shape   // for a Jitter above 0
}

// Mean is the mean latency once it is cut, s.
func (c DelayConfig) Mean() float64 {
	if c.Jitter == 0 {
		return c.Latency
	}
	low := -c.Latency / c.Jitter // where it is cut, in standard deviations
	switch c.Shape {
	case Uniform:
		half := math.Sqrt(3)
		return c.Latency + c.Jitter*(math.Max(low, -half)+half)/2
	case Normal:
		density := math.Exp(-low*low/2) / math.Sqrt(2*math.Pi)
		return c.Latency + c.Jitter*density/(math.Erfc(low/math.Sqrt2)/2)
	default: // an exponential beyond a cut is the same exponential from there on
		return c.Latency + c.Jitter*(math.Max(low, -1)+1)
	}
}

// mostPending bounds how many ticks long a latency may be, and with it the
// memory for levels on their way.
const mostPending = 1 << 24

func (c DelayConfig) validate() error {
	known := c.Jitter == 0
	for _, s := range Shapes {
		known = known || s == c.Shape
	}
	switch {
	case !(c.Rate > 0) || math.IsInf(c.Rate, 0):
		return fmt.Errorf("chain: rate %g Hz, want a positive number", c.Rate)
	case !(c.Latency >= 0) || !(c.Jitter >= 0) || !((c.Latency+20*c.Jitter)*c.Rate < mostPending):
		return fmt.Errorf("chain: latency %g s with a jitter of %g s at %g Hz, want none negative and latency + 20·jitter below %d ticks", c.Latency, c.Jitter, c.Rate, mostPending)
	case !known:
		return fmt.Errorf("chain: jitter of shape %q, want one of %q", c.Shape, Shapes)
	}
	return nil
}

// A Command is a level on its way.
type Command struct {
	Decided int64 // tick whose sample decided it
	Tick    int64 // last tick at or before the actuation
	Offset  float64
	Level   trace.Level
}

// A Delay is a delay line: levels leave it in the order in which they came, a
// late one holding up those behind it. It must be made by NewDelay and must
// not be used by two goroutines at once.
type Delay struct {
	config DelayConfig
	ticks  int64   // of a latency without jitter
	rest   float64 // s
	draw   *variate.Normal

	ring       []Command // its length a power of two
	head, tail int64     // next to leave, next free
}

// NewDelay makes a Delay.
func NewDelay(c DelayConfig, draw *variate.Normal) (*Delay, error) {
	if err := c.validate(); err != nil {
		return nil, err
	}
	d := &Delay{config: c, draw: draw}
	d.ticks, d.rest = wholeTicks(c.Latency, c.Rate)
	size := 2
	for float64(size) < (c.Latency+20*c.Jitter)*c.Rate+2 {
		size *= 2
	}
	d.ring = make([]Command, size)
	return d, nil
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

// Offset returns the offset after a tick at which levels act without jitter,
// s.
func (d *Delay) Offset() float64 { return d.rest }

// Push sends a level on its way at a tick. Of several levels of one tick the
// last holds. It allocates only where more levels are on their way than 20
// standard deviations of jitter explain.
func (d *Delay) Push(tick int64, level trace.Level) {
	mask := int64(len(d.ring) - 1)
	var last *Command
	if d.head < d.tail {
		last = &d.ring[(d.tail-1)&mask]
		if last.Decided == tick {
			last.Level = level
			return
		}
	}
	c := Command{Decided: tick, Tick: tick + d.ticks, Offset: d.rest, Level: level}
	if d.config.Jitter > 0 {
		n, rest := wholeTicks(d.latency(), d.config.Rate)
		c.Tick, c.Offset = tick+n, rest
		if last != nil && (c.Tick < last.Tick || c.Tick == last.Tick && c.Offset < last.Offset) {
			c.Tick, c.Offset = last.Tick, last.Offset
		}
	}
	if d.tail-d.head == int64(len(d.ring)) {
		d.grow()
		mask = int64(len(d.ring) - 1)
	}
	d.ring[d.tail&mask] = c
	d.tail++
}

func (d *Delay) grow() {
	ring := make([]Command, 2*len(d.ring))
	for i := d.head; i < d.tail; i++ {
		ring[i&int64(len(ring)-1)] = d.ring[i&int64(len(d.ring)-1)]
	}
	d.ring = ring
}

// latency draws one, s.
func (d *Delay) latency() float64 {
	c := &d.config
	for range 1000 {
		var j float64
		switch c.Shape {
		case Uniform:
			j = math.Sqrt(3) * (2*d.draw.Float64() - 1)
		case Normal:
			j = d.draw.Next()
		default:
			j = -math.Log(d.draw.Float64()) - 1
		}
		if l := c.Latency + j*c.Jitter; l >= 0 {
			return l
		}
	}
	return 0 // a thousand negative ones in a row: the mean is far below 0
}

// Due returns the tick after which the next level acts, and never where there
// is none.
func (d *Delay) Due() int64 {
	if d.head == d.tail {
		return Never
	}
	return d.ring[d.head&int64(len(d.ring)-1)].Tick
}

// Never is a tick that does not come.
const Never = math.MaxInt64

// Pop takes the next level out. It panics if there is none.
func (d *Delay) Pop() Command {
	if d.head == d.tail {
		panic("chain: no level is on its way")
	}
	c := d.ring[d.head&int64(len(d.ring)-1)]
	d.head++
	return c
}

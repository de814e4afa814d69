package plant

import (
	"math"

	"brinkwell/controller/trace"
	"brinkwell/plant/chain"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// chained is what a plant needs beyond a plain one: poles, jitter, a sensor
// with errors of every kind, lost ticks.
type chained struct {
	mover  *chain.Mover
	sensor *chain.Sensor
	lost   *variate.Normal
	loses  float64 // probability
	begins bool

	fresh    []trace.Event // of this tick
	at, work []float64     // positions at, and work of, the moves of this tick
	current  trace.Event   // with a lag: the actuation whose centre is on its way
	going    bool          // whether there is one
}

func newChained(c Config, offset float64, within *variate.Normal, stream func(uint64) *variate.Normal) (*chained, error) {
	mover, err := chain.NewMover(chain.MoverConfig{
		Oscillator: c.Oscillator,
		Poles:      chain.Poles{Lag: c.Lag, Bandwidth: c.Sensor.Bandwidth, HighPass: c.Sensor.HighPass},
		Tick:       1 / c.Rate,
		Threshold:  c.Threshold,
		Offset:     offset,
		Anywhere:   c.Jitter > 0,
		Own:        stream(streamPoles),
		Within:     within,
	})
	if err != nil {
		return nil, err
	}
	sensor, err := chain.NewSensor(c.Sensor, stream(streamSensor), stream(streamSticks))
	if err != nil {
		return nil, err
	}
	return &chained{
		mover: mover, sensor: sensor, lost: stream(streamLost), loses: c.LostTicks, begins: true,
		fresh: make([]trace.Event, 0, 8), at: make([]float64, 8), work: make([]float64, 9),
	}, nil
}

// senseChained is Sense for a plant that is not plain.
func (p *Plant) senseChained(tick int64, s *trace.Sample) {
	c := p.chained
	if c.begins {
		c.begins = false
	} else {
		p.advance(tick-1, p.bath.Next())
	}
	s.Position, s.Velocity = c.mover.Position(), c.mover.Velocity()
	reading := c.sensor.Read(tick, c.mover.Seen())
	known := reading
	if c.loses > 0 && c.lost.Float64() < c.loses {
		reading, known = math.NaN(), p.last
	}
	s.Measured = reading
	for i := range c.fresh {
		e := &c.fresh[i]
		e.Measured = p.last + (known-p.last)*e.Offset*p.rate
		p.file(*e)
	}
	if c.going && !c.mover.Unsettled(p.centres[trace.Upper]-p.centres[trace.Lower]) {
		p.acted, c.going = append(p.acted, c.current), false
	}
	p.last = known
}

// advance steps from a tick to the next one, with the levels that act on the
// way.
func (p *Plant) advance(tick int64, n *resonator.Kick) {
	c := p.chained
	c.mover.Begin()
	c.fresh = c.fresh[:0]
	for p.due == tick {
		command := p.delay.Pop()
		p.due = p.delay.Due()
		c.mover.MoveAt(command.Offset, p.centres[command.Level])
		c.fresh = append(c.fresh, trace.Event{Decided: command.Decided, Tick: tick, Offset: command.Offset, Level: command.Level})
		p.level = command.Level
	}
	for len(c.work) <= len(c.fresh) {
		c.at, c.work = append(c.at, 0), append(c.work, 0)
	}
	c.mover.End(n, c.at, c.work)
	work := c.work
	if c.mover.Lagging() {
		c.current.Work += work[0] // what went on before the first move
		work = work[1:]
	}
	for i := range c.fresh {
		c.fresh[i].Position, c.fresh[i].Work = c.at[i], work[i]
	}
}

// file puts an actuation among those that are known, or, with a lag, makes it
// the one that is on its way.
func (p *Plant) file(e trace.Event) {
	c := p.chained
	if !c.mover.Lagging() {
		p.acted = append(p.acted, e)
		return
	}
	if c.going {
		p.acted = append(p.acted, c.current)
	}
	c.current, c.going = e, true
}

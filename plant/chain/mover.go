package chain

import (
	"errors"
	"math"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// A Mover is a resonator with the poles around it, stepped from tick to tick
// exactly in distribution, with targets of its centre that move at any
// instants within a tick. With the kicks of one Bath its resonator moves as a
// resonator.Resonator does.
//
// It must be made by NewMover and must not be used by two goroutines at once.
type Mover struct {
	z      [states]float64 // relative to target; m, m/s
	target float64         // m
	before [states]float64 // z at the tick's start
	moves  []move          // in this tick

	phi     [states][states]float64
	lowX    [2]float64 // noise of the sensor's poles by the kick's X …
	lowV    [2]float64 // … and V: low-pass, high-pass
	rest    [3]float64 // Cholesky factor of what is left of it
	own     *variate.Normal
	within  *variate.Normal
	instant instants
	work    work
	high    bool // whether there is a high-pass
	low     bool // whether there is a low-pass
	lagging bool // whether there is a lag

	stiffness, threshold, dt float64
}

// A move is a target that moved within a tick.
type move struct {
	offset float64 // after the tick's start, s
	by     float64 // m
	at     instant
}

// A MoverConfig says what a Mover is made of.
type MoverConfig struct {
	Oscillator motion.Oscillator
	Poles      Poles
	Tick       float64 // s
	Threshold  float64 // where the potential is continuous, m; for the work
	// Offset is the instant within a tick at which targets move, s; Anywhere
	// says that they may move at any.
	Offset   float64
	Anywhere bool
	Own      *variate.Normal // noise of the sensor's poles, beside the kick's
	Within   *variate.Normal // positions within a tick
}

// NewMover makes a Mover at rest about 0.
func NewMover(c MoverConfig) (*Mover, error) {
	if !(c.Tick > 0) || math.IsInf(c.Tick, 0) {
		return nil, errors.New("chain: a tick must take a positive time")
	}
	for _, v := range []float64{c.Poles.Lag, c.Poles.Bandwidth, c.Poles.HighPass} {
		if !(v >= 0) || math.IsInf(v, 0) {
			return nil, errors.New("chain: lag, bandwidth and high-pass must be finite and not negative")
		}
	}
	s := newSystem(c.Oscillator, c.Poles)
	m := &Mover{
		phi: s.flow(c.Tick), own: c.Own, within: c.Within, moves: make([]move, 0, 8),
		low: c.Poles.Bandwidth > 0, high: c.Poles.HighPass > 0, lagging: c.Poles.Lag > 0,
		stiffness: c.Oscillator.Stiffness, threshold: c.Threshold, dt: c.Tick,
	}
	m.follow(s.noise(c.Tick), c.Oscillator.Noise(c.Tick))
	m.instant = newInstants(s, c)
	if m.lagging {
		m.work = newWork(c.Tick / c.Poles.Lag)
	}
	return m, nil
}

// follow splits the noise of the sensor's poles into what the kick tells of it
// and the rest.
func (m *Mover) follow(all [states][states]float64, kick motion.Covariance) {
	xx, vx, vv := kick.Cholesky()
	if xx == 0 {
		return
	}
	var residual [2][2]float64
	var a, b [2]float64
	for i, k := range []int{stateLow, stateHigh} {
		a[i] = all[k][stateU] / xx
		b[i] = (all[k][stateV] - vx*a[i]) / vv
		m.lowV[i] = b[i] / vv
		m.lowX[i] = (a[i] - vx*m.lowV[i]) / xx
	}
	for i, k := range []int{stateLow, stateHigh} {
		for j, l := range []int{stateLow, stateHigh} {
			residual[i][j] = all[k][l] - a[i]*a[j] - b[i]*b[j]
		}
	}
	// What is left is the fifth order in the tick: rounding may make it negative.
	m.rest[0] = math.Sqrt(math.Max(0, residual[0][0]))
	if m.rest[0] > 0 {
		m.rest[1] = residual[0][1] / m.rest[0]
	}
	m.rest[2] = math.Sqrt(math.Max(0, residual[1][1]-m.rest[1]*m.rest[1]))
}

// Set puts the resonator at position x, in metres, with velocity v, in m/s,
// its centre at a target, in metres, and the sensor's poles where a long past
// would have left them: the low-pass at x, the high-pass at the mean position.
func (m *Mover) Set(x, v, target, mean float64) {
	m.z = [states]float64{stateU: x - target, stateV: v, stateLow: x - target, stateHigh: mean - target}
	m.target = target
}

// Position returns the true position, m.
func (m *Mover) Position() float64 { return m.target + m.z[stateU] }

// Velocity returns the velocity, m/s.
func (m *Mover) Velocity() float64 { return m.z[stateV] }

// Seen returns the position behind the sensor's poles, m; with a high-pass its
// slow part is missing.
func (m *Mover) Seen() float64 {
	seen := m.z[stateU]
	if m.low {
		seen = m.z[stateLow]
	}
	if m.high {
		return seen - m.z[stateHigh]
	}
	return m.target + seen
}

// Lagging reports whether the centre lags behind its target.
func (m *Mover) Lagging() bool { return m.lagging }

// Begin starts a tick.
func (m *Mover) Begin() {
	m.before = m.z
	m.moves = m.moves[:0]
}

// MoveAt moves the target, in metres, offset seconds after the tick's start,
// not before the last move.
func (m *Mover) MoveAt(offset, target float64) {
	by := target - m.target
	m.moves = append(m.moves, move{offset: offset, by: by, at: m.instant.at(offset)})
	m.target = target
}

// End steps to the tick's end with the bath's kick. Where moves happened, at
// receives the positions at their instants, and work the work done on the
// resonator: without a lag each move's own, at once; with one, what went on in
// this tick, before the first move and from each move on. at and work must
// hold one entry a move and one more for the work. Neither allocates.
func (m *Mover) End(n *resonator.Kick, at, work []float64) {
	z := &m.before
	var next [states]float64
	for i := range states {
		row := &m.phi[i]
		sum := 0.0
		for j := range states {
			sum += row[j] * z[j]
		}
		next[i] = sum
	}
	next[stateU] += n.X
	next[stateV] += n.V
	if m.low || m.high {
		g, h := m.own.Next(), m.own.Next()
		next[stateLow] += m.lowX[0]*n.X + m.lowV[0]*n.V + m.rest[0]*g
		next[stateHigh] += m.lowX[1]*n.X + m.lowV[1]*n.V + m.rest[1]*g + m.rest[2]*h
	}
	m.z = next
	if len(m.moves) > 0 {
		m.endMoves(n, at)
	}
	m.endWork(at, work)
}

// endMoves adds the response to the targets that moved within the tick, and
// draws the positions at their instants.
func (m *Mover) endMoves(n *resonator.Kick, at []float64) {
	old := m.target
	for i := range m.moves {
		old -= m.moves[i].by
	}
	for i := range m.moves {
		mv := &m.moves[i]
		b := &mv.at.bridge
		at[i] = old + mv.at.to[0]*m.before[stateU] + mv.at.to[1]*m.before[stateV] + mv.at.to[2]*m.before[stateLag] +
			b.GainX*n.X + b.GainV*n.V + b.Spread*m.within.Next()
		for j := range i {
			// A former move in this tick: the response since, and the target's own.
			earlier := &m.moves[j]
			at[i] += earlier.by * (1 + m.instant.since(mv.offset - earlier.offset)[stateU])
		}
		for k := range states {
			m.z[k] += mv.by * mv.at.response[k]
		}
	}
}

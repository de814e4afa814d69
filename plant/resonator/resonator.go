// Package resonator is the thermally driven oscillator, stepped from tick to
// tick exactly in distribution: plant/motion with a random source.
//
// It knows one parabola whose centre moves at given instants; levels, sensors
// and loops are its users' matter.
package resonator

import (
	"errors"
	"math"

	"brinkwell/plant/motion"
	"brinkwell/plant/variate"
)

// A Resonator is a damped oscillator in a bath,
//
//	m·x″ = -k·(x - centre) - m·Γ·x′ + √(2·m·Γ·kT)·ξ(t),  ⟨ξ(t)ξ(s)⟩ = δ(t-s),
//
// with Γ = ω0/Q, driven by the Kicks of a Bath. A step is exact in
// distribution: a shorter tick samples more finely, not more accurately.
//
// It must be made by New and must not be used by two goroutines at once.
type Resonator struct {
	u, v   float64 // displacement from the centre, m; velocity, m/s
	centre float64 // m

	phi        motion.Propagator // of a tick
	oscillator motion.Oscillator
	dt         float64 // s
}

// New makes a Resonator at rest in a parabola about 0, for ticks of dt
// seconds.
func New(o motion.Oscillator, dt float64) (*Resonator, error) {
	if !(dt > 0) || math.IsInf(dt, 0) {
		return nil, errors.New("resonator: a tick must take a positive time")
	}
	return &Resonator{phi: o.Propagate(dt), oscillator: o, dt: dt}, nil
}

// Set puts the resonator at position x, in metres, with velocity v, in m/s, in
// a parabola about centre, in metres.
func (r *Resonator) Set(x, v, centre float64) { r.u, r.v, r.centre = x-centre, v, centre }

// Position returns the position, m.
func (r *Resonator) Position() float64 { return r.centre + r.u }

// Velocity returns the velocity, m/s.
func (r *Resonator) Velocity() float64 { return r.v }

// Step advances by one tick with the bath's kick.
func (r *Resonator) Step(n *Kick) {
	u, v := r.u, r.v
	r.u = r.phi.XX*u + r.phi.XV*v + n.X
	r.v = r.phi.VX*u + r.phi.VV*v + n.V
}

// Move moves the centre, in metres, at the present instant.
func (r *Resonator) Move(centre float64) {
	r.u += r.centre - centre
	r.centre = centre
}

// A Split is an instant within a tick: what StepMoving needs to know of it.
type Split struct {
	bridge       Bridge
	toXX, toXV   float64 // propagator to the instant, position row
	moveX, moveV float64 // response at the tick's end to a centre moved by 1
}

// Split returns the instant offset seconds after a tick, offset in [0, dt). It
// panics otherwise.
func (r *Resonator) Split(offset float64) Split {
	if !(offset >= 0 && offset < r.dt) {
		panic("resonator: an instant outside its tick")
	}
	to := r.oscillator.Propagate(offset)
	s := Split{bridge: NewBridge(r.oscillator, r.dt, offset), toXX: to.XX, toXV: to.XV}
	s.moveX, s.moveV = r.oscillator.StepResponse(r.dt - offset)
	return s
}

// StepMoving advances by one tick with the bath's kick, while at the split's
// instant the centre moves, and returns the position at that instant, m.
func (r *Resonator) StepMoving(n *Kick, s *Split, centre float64, within *variate.Normal) (at float64) {
	u, v := r.u, r.v
	r.Step(n)
	b := &s.bridge
	at = r.centre + s.toXX*u + s.toXV*v + b.GainX*n.X + b.GainV*n.V + b.Spread*within.Next()
	shift := centre - r.centre
	r.u += s.moveX * shift
	r.v += s.moveV * shift
	r.Move(centre)
	return at
}

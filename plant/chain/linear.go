// Package chain is what lies between the true motion and the loop: the
// sensor's noise, poles, errors and converter, the delay line with its jitter,
// and the output's lag.
//
// Poles are stepped exactly, together with the resonator that they follow. The
// package knows nothing of who decides, and imports only plant/... and the
// leaves.
package chain

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"brinkwell/plant/motion"
)

// Poles are the one-pole lags around a resonator. Zero means none.
type Poles struct {
	Lag       float64 // time constant of the output: the centre follows its target, s
	Bandwidth float64 // of the sensor: a low-pass, Hz
	HighPass  float64 // of the sensor: AC coupling behind the low-pass, Hz
}

// None reports whether there is no pole at all.
func (p Poles) None() bool { return p == Poles{} }

// The states of a resonator with poles, all relative to the target of the
// centre, so that they relax to 0: displacement, velocity, the centre's own
// distance from its target, the low-pass's output and the high-pass's memory.
const (
	stateU = iota
	stateV
	stateLag
	stateLow
	stateHigh
	states
)

// A system is the linear law z′ = A·z + noise on the velocity, in reduced
// units: time 1/omega0, velocity m·omega0. States that a bench lacks follow
// the displacement at once and take no part.
type system struct {
	oscillator motion.Oscillator
	poles      Poles
	active     [states]bool
	a          *mat.Dense // of the active states, in their order
	index      []int      // of the active states
}

func newSystem(o motion.Oscillator, p Poles) system {
	s := system{oscillator: o, poles: p, active: [states]bool{
		stateU: true, stateV: true,
		stateLag: p.Lag > 0, stateLow: p.Bandwidth > 0, stateHigh: p.HighPass > 0,
	}}
	place := [states]int{}
	for k, on := range s.active {
		if on {
			place[k] = len(s.index)
			s.index = append(s.index, k)
		}
	}
	w0 := o.Omega0
	a := mat.NewDense(len(s.index), len(s.index), nil)
	set := func(row, column int, v float64) { a.Set(place[row], place[column], v) }
	set(stateU, stateV, 1)
	set(stateV, stateU, -1)
	set(stateV, stateV, -1/o.Quality)
	if s.active[stateLag] {
		set(stateV, stateLag, 1)
		set(stateLag, stateLag, -1/(p.Lag*w0))
	}
	seen := stateU
	if s.active[stateLow] {
		rate := 2 * math.Pi * p.Bandwidth / w0
		set(stateLow, stateU, rate)
		set(stateLow, stateLow, -rate)
		seen = stateLow
	}
	if s.active[stateHigh] {
		rate := 2 * math.Pi * p.HighPass / w0
		set(stateHigh, seen, rate)
		set(stateHigh, stateHigh, -rate)
	}
	s.a = a
	return s
}

// jump is how the states change when the target moves up by 1: all positions
// are then 1 lower, relative to it.
func (s system) jump() (d [states]float64) {
	for _, k := range s.index {
		if k != stateV {
			d[k] = -1
		}
	}
	return d
}

// flow returns the propagator over t seconds, in SI, rows and columns by
// state. The oscillator's own block comes from motion, free of the matrix
// exponential's rounding.
func (s system) flow(t float64) (phi [states][states]float64) {
	var scaled, e mat.Dense
	scaled.Scale(t*s.oscillator.Omega0, s.a)
	e.Exp(&scaled)
	for i, row := range s.index {
		for j, column := range s.index {
			phi[row][column] = e.At(i, j) * s.unit(row) / s.unit(column)
		}
	}
	p := s.oscillator.Propagate(t)
	phi[stateU][stateU], phi[stateU][stateV] = p.XX, p.XV
	phi[stateV][stateU], phi[stateV][stateV] = p.VX, p.VV
	return phi
}

// unit is the SI size of a state's reduced unit.
func (s system) unit(state int) float64 {
	if state == stateV {
		return s.oscillator.Omega0
	}
	return 1
}

// noise returns the covariance of the thermal noise over t seconds, in SI. It
// doubles a step that is short enough for the block exponential of C.F. van
// Loan, IEEE Trans. Autom. Control 23, 395 (1978), which a stiff pole would
// otherwise overflow: C(2t) = Φ·C·Φᵀ + C.
func (s system) noise(t float64) (c [states][states]float64) {
	n := len(s.index)
	turn := t * s.oscillator.Omega0
	halvings := max(0, int(math.Ceil(math.Log2(mat.Norm(s.a, math.Inf(1))*turn)))+1)
	step := math.Ldexp(turn, -halvings)

	block := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for j := range n {
			block.Set(i, j, -s.a.At(i, j)*step)
			block.Set(n+i, n+j, s.a.At(j, i)*step)
		}
	}
	// Reduced, the velocity's noise has density 2/Q in units of kT/k.
	block.Set(stateV, n+stateV, 2/s.oscillator.Quality*step)
	var e, phi, cov mat.Dense
	e.Exp(block)
	phi.CloneFrom(e.Slice(n, 2*n, n, 2*n).T())
	cov.Mul(&phi, e.Slice(0, n, n, 2*n))
	for range halvings {
		var once, twice, both mat.Dense
		once.Mul(&phi, &cov)
		twice.Mul(&once, phi.T())
		cov.Add(&cov, &twice)
		both.Mul(&phi, &phi)
		phi.CloneFrom(&both)
	}
	size := s.oscillator.KT / s.oscillator.Stiffness
	for i, row := range s.index {
		for j, column := range s.index {
			c[row][column] = cov.At(i, j) * size * s.unit(row) * s.unit(column)
		}
	}
	return c
}

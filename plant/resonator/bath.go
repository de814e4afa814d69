package resonator

import (
	"brinkwell/plant/motion"
	"brinkwell/plant/variate"
)

// A Kick is what the bath adds to position, in m, and velocity, in m/s, in one
// tick. It is the same whether or not the centre moves within the tick, so
// that two runs of one seed differ only by what was done to them.
type Kick struct{ X, V float64 }

// kicksDrawn are drawn at once; they fit the first-level cache.
const kicksDrawn = 512

// A Bath draws the thermal noise of an oscillator, tick by tick. It must be
// made by NewBath and must not be used by two goroutines at once.
type Bath struct {
	normal *variate.Normal
	chol   cholesky
	kicks  []Kick
	next   int
	draws  []float64
}

// NewBath makes the Bath of an oscillator for ticks of dt seconds.
func NewBath(o motion.Oscillator, dt float64, normal *variate.Normal) *Bath {
	return &Bath{
		normal: normal,
		chol:   newCholesky(o, dt),
		kicks:  make([]Kick, kicksDrawn),
		next:   kicksDrawn,
		draws:  make([]float64, 2*kicksDrawn),
	}
}

// Next returns the next tick's kick, which holds until the next call. It does
// not allocate.
func (b *Bath) Next() *Kick {
	if b.next == kicksDrawn {
		b.draw()
	}
	n := &b.kicks[b.next]
	b.next++
	return n
}

func (b *Bath) draw() {
	b.normal.Fill(b.draws)
	c := b.chol
	for i := range b.kicks {
		x, v := b.draws[2*i], b.draws[2*i+1]
		b.kicks[i] = Kick{X: c.xx * x, V: c.vx*x + c.vv*v}
	}
	b.next = 0
}

// cholesky is the lower factor of a tick's noise covariance.
type cholesky struct{ xx, vx, vv float64 }

func newCholesky(o motion.Oscillator, dt float64) cholesky {
	xx, vx, vv := o.Noise(dt).Cholesky()
	return cholesky{xx, vx, vv}
}

// solve returns L⁻¹·(x, v), 0 where there is no noise.
func (c cholesky) solve(x, v float64) (a, b float64) {
	if c.xx == 0 {
		return 0, 0
	}
	a = x / c.xx
	return a, (v - c.vx*a) / c.vv
}

// solveTransposed returns L⁻ᵀ·(a, b), 0 where there is no noise.
func (c cholesky) solveTransposed(a, b float64) (x, v float64) {
	if c.xx == 0 {
		return 0, 0
	}
	v = b / c.vv
	return (a - c.vx*v) / c.xx, v
}

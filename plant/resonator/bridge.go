package resonator

import (
	"math"

	"brinkwell/plant/motion"
)

// A Bridge gives the thermal displacement at an instant within a tick, when
// the whole tick's Kick is known: normal with mean GainX·X + GainV·V and
// standard deviation Spread.
//
// With η the noise up to the instant and Φ, ρ propagator and noise of the rest
// of the tick, the whole tick's noise is ξ = Φ·η + ρ; given ξ, η is normal with
// mean K·ξ, K = C_η·Φᵀ·C_ξ⁻¹, and covariance C_η - K·Φ·C_η.
type Bridge struct {
	GainX  float64 // m per m
	GainV  float64 // m per m/s
	Spread float64 // m
}

// NewBridge returns the Bridge of an oscillator to an instant offset seconds
// after the start of a tick of dt seconds, offset in [0, dt].
func NewBridge(o motion.Oscillator, dt, offset float64) Bridge {
	if offset == dt {
		return Bridge{GainX: 1}
	}
	after, cov := o.Propagate(dt-offset), o.Noise(offset)
	chol := newCholesky(o, dt)
	// First row of C_η·Φᵀ: covariance of the noise at the instant with ξ.
	a, b := chol.solve(cov.XX*after.XX+cov.XV*after.XV, cov.XX*after.VX+cov.XV*after.VV)
	br := Bridge{Spread: math.Sqrt(math.Max(0, cov.XX-a*a-b*b))}
	br.GainX, br.GainV = chol.solveTransposed(a, b)
	return br
}

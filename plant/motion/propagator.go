package motion

import "math"

// A Propagator is the matrix Φ that takes displacement from the centre and
// velocity, (x, v), over a step of the motion without noise.
type Propagator struct {
	XX float64 // dimensionless
	XV float64 // s
	VX float64 // 1/s
	VV float64 // dimensionless
}

// Propagate returns Φ for a step of dt seconds:
//
//	Φ = e^{-Γdt/2}·[ cc + Γ/2·ss        ss      ]
//	               [   -ω₀²·ss     cc - Γ/2·ss ],
//
// with cc = cos ω_d·dt, ss = sin(ω_d·dt)/ω_d, ω_d = √(ω₀² - Γ²/4), and their
// continuations where Q <= 1/2. For dt = 0 it is the identity. See the package
// comment for the source.
//
// Its entries are exact to 1e-15·(1 + ω₀·dt) of the largest of Φ_xx, ω₀·Φ_xv
// and Φ_vv; those of Φ_xx, Φ_xv and Φ_vx are so of themselves for Q <= 1/2, or
// ω₀·dt < 1.
//
// Propagate panics if dt is negative, infinite or not a number.
func (o Oscillator) Propagate(dt float64) Propagator {
	f := o.modes().flow(o.turn(dt))
	return Propagator{XX: f.xx, XV: f.xv / o.Omega0, VX: -f.xv * o.Omega0, VV: f.vv}
}

// StepResponse returns what becomes, after dt seconds, of an oscillator at
// rest in its centre when the centre moves by one metre at the start: the
// displacement dx = 1 - Φ_xx in metres and the velocity dv = -Φ_vx in m/s,
// both per metre. Short steps lose no digits: dx ~ (ω₀·dt)²/2.
//
// StepResponse panics if dt is negative, infinite or not a number.
func (o Oscillator) StepResponse(dt float64) (dx, dv float64) {
	m, t := o.modes(), o.turn(dt)
	f := m.flow(t)
	return m.stepResponse(t, f), f.xv * o.Omega0
}

// Correlation returns the autocorrelation ⟨x(0)x(t)⟩/⟨x²⟩ of the position in
// equilibrium at a lag of t seconds of either sign,
//
//	e^{-Γ|t|/2}·(cos ω_d·t + Γ/2·sin(ω_d·|t|)/ω_d).
//
// Correlation panics if t is infinite or not a number.
func (o Oscillator) Correlation(t float64) float64 {
	return o.modes().flow(o.turn(math.Abs(t))).xx
}

package motion

import "math"

// A Covariance is that of displacement and velocity, a symmetric matrix.
type Covariance struct {
	XX float64 // m²
	XV float64 // m²/s
	VV float64 // m²/s²
}

// Noise returns the covariance of what the thermal force adds to displacement
// and velocity over a step of dt seconds. With S = diag(k_B·T/k, k_B·T/m) it is
// C = S - Φ·S·Φᵀ, which is how it is given in the source named at the package;
// computed here is the equal
//
//	C_xx = 2Γ·k_B·T/m·∫Φ_xv(s)²ds,  C_xv = Γ·k_B·T/m·Φ_xv(dt)²,
//	C_vv = 2Γ·k_B·T/m·∫Φ_vv(s)²ds,  s from 0 to dt,
//
// which is free of cancellation: for short steps the entries go as dt³, dt² and
// dt. For dt = 0 it is zero.
//
// C_xx and C_vv are exact to 3e-15, C_xv to that of √(C_xx·C_vv) and to the
// rounding of the phase ω₀·dt; C is positive definite for dt > 0 as long as
// C_xx does not underflow.
//
// Noise takes up to a microsecond: to step evenly, call it once. It panics if
// dt is negative, infinite or not a number.
func (o Oscillator) Noise(dt float64) Covariance {
	c := o.modes().noise(o.turn(dt))
	variance := o.variance()
	return Covariance{
		XX: variance * c.xx,
		XV: variance * o.Omega0 * c.xv,
		VV: variance * o.Omega0 * o.Omega0 * c.vv,
	}
}

// Cholesky returns the lower triangular factor L of c = L·Lᵀ: l11 in m, l21 and
// l22 in m/s. With independent standard normal a and b,
//
//	x = l11·a,  v = l21·a + l22·b
//
// have the covariance c. For a Covariance from Noise, l22 is exact to 1e-14
// however short the step is: there c is nearly singular only through its units,
// and C_xv²/C_xx tends to 3/4 of C_vv.
//
// Cholesky panics if c is not positive semidefinite.
func (c Covariance) Cholesky() (l11, l21, l22 float64) {
	if c.XX == 0 && c.XV*c.XV == 0 && c.VV >= 0 {
		return 0, 0, math.Sqrt(c.VV)
	}
	l11 = math.Sqrt(c.XX)
	l21 = c.XV / l11
	rest := c.VV - l21*l21
	if !(c.XX > 0 && rest >= 0) {
		panic("motion: the covariance is not positive semidefinite")
	}
	return l11, l21, math.Sqrt(rest)
}

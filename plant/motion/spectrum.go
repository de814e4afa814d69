package motion

import "math"

// Spectrum returns the one-sided power spectral density of the position at the
// frequency f in Hz, in m²/Hz, of either sign of f:
//
//	S(f) = 4Γ·k_B·T/m / [(ω₀² - ω²)² + Γ²ω²],  ω = 2πf.
//
// Its integral over all positive f is k_B·T/k. It panics if f is infinite or
// not a number.
func (o Oscillator) Spectrum(f float64) float64 {
	requireFrequency(f)
	damping := o.Damping() / o.Omega0
	u := 2 * math.Pi * math.Abs(f) / o.Omega0
	detuning := (1 - u) * (1 + u)
	return 4 * o.variance() * damping / o.Omega0 / (detuning*detuning + damping*u*damping*u)
}

// SampledSpectrum returns the one-sided power spectral density, in m²/Hz, of
// the position sampled every dt seconds in an infinite record, at the frequency
// f in Hz. It is what Spectrum becomes by aliasing, and so is even in f with
// period 1/dt; its integral from 0 to 1/(2·dt) is k_B·T/k.
//
// The samples are an ARMA(2,1) process: with z = e^{2πif·dt}, the eigenvalues
// λ of Φ, and L the Cholesky factor of the noise covariance C,
//
//	P = 2·dt·{|L_xx·(1 - Φ_vv·z) + L_vx·Φ_xv·z|² + (L_vv·Φ_xv)²} / |(1-λ₊z)(1-λ₋z)|²,
//
// a sum and product of positive terms without cancellation. This is the result
// of the source named at the package, in a form derived for this one. The
// relative error is below 1e-14, to which comes the rounding of the angles
// 2πf·dt and ω₀·dt as seen through the peak: up to 1e-15·Q at a narrow resonance.
//
// SampledSpectrum panics if dt is not positive and finite, or f is infinite or
// not a number.
func (o Oscillator) SampledSpectrum(f, dt float64) float64 {
	requireFrequency(f)
	requirePositive(dt, "dt")
	return 2 * dt * o.variance() * o.modes().sampled(o.turn(dt), 2*math.Pi*f*dt)
}

// sampled returns the two-sided density, in units of k_B·T/k times the step t,
// at an angle of theta radians a sample.
func (m modes) sampled(t, theta float64) float64 {
	f, c := m.flow(t), m.noise(t)
	moving := c.xx*distance(f.vv-f.xv*c.xv/c.xx, theta) + f.xv*f.xv*(c.vv-c.xv*c.xv/c.xx)
	d := m.denominator(t, theta)
	return moving / (real(d)*real(d) + imag(d)*imag(d))
}

// distance returns |1 - root·e^{i·theta}|² for a real root, as a sum of positive
// terms: it is small where two samples a period alias a narrow resonance.
func distance(root, theta float64) float64 {
	sin, cos := math.Sincos(theta / 2)
	if root < 0 {
		return (1+root)*(1+root) - 4*root*cos*cos
	}
	return (1-root)*(1-root) + 4*root*sin*sin
}

// denominator returns (1-λ₊z)(1-λ₋z) = det(1 - zΦ) for z = e^{i·theta}.
func (m modes) denominator(t, theta float64) complex128 {
	if m.overdamped {
		return one(m.slow*t, theta) * one(m.fast*t, theta)
	}
	return one(m.half*t, theta+m.split*t) * one(m.half*t, theta-m.split*t)
}

// one returns 1 - exp(-decay + i·angle).
func one(decay, angle float64) complex128 {
	modulus := math.Exp(-decay)
	sin := math.Sin(angle / 2)
	return complex(-math.Expm1(-decay)+2*modulus*sin*sin, -modulus*math.Sin(angle))
}

func requireFrequency(f float64) {
	if math.IsInf(f, 0) || math.IsNaN(f) {
		panic("motion: f is not finite")
	}
}

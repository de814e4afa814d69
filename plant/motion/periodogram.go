package motion

import "math"

// MeanPeriodogram returns the exact mean of the one-sided periodogram of n
// samples taken dt seconds apart without a window or removal of the mean, at
// the frequency k/(n·dt): with C the autocovariance of the position, in m²/Hz,
//
//	⟨2·dt/n·|Σ x_j·e^{-2πijk/n}|²⟩ = 2·dt·Σ (1 - |j|/n)·C(j·dt)·cos(2πjk/n),  |j| < n.
//
// It is SampledSpectrum plus the leakage of a finite record. Every k counts
// twice, 0 and n/2 too: an estimator that does not double those two has half
// the mean there.
//
// The sum is done in closed form, so that the cost does not depend on n. Its
// relative error is that of SampledSpectrum, times one plus the memory of the
// motion over the length of the record, and 1e-16·ω₀·n·dt.
//
// MeanPeriodogram panics if n is not positive, k is outside 0 to n/2, or dt is
// not positive and finite.
func (o Oscillator) MeanPeriodogram(k, n int, dt float64) float64 {
	if !(n > 0 && k >= 0 && k <= n/2) {
		panic("motion: k is outside 0 to n/2")
	}
	requirePositive(dt, "dt")
	m, t := o.modes(), o.turn(dt)
	theta := 2 * math.Pi * float64(k) / float64(n)
	mean := m.sampled(t, theta) + m.leakage(t, o.turn(dt*float64(n)), theta)/float64(n)
	return 2 * dt * o.variance() * mean
}

// leakage returns the xx entry of -2·Re zΦ(1 - Φⁿ)(1 - zΦ)⁻², the part of the
// sum over 1 - |j|/n that falls as 1/n, for a record of length all = n·t; zⁿ = 1.
func (m modes) leakage(t, all, theta float64) float64 {
	step, whole := m.flow(t), m.flow(all)
	sin, cos := math.Sincos(theta)
	half := math.Sin(theta / 2)
	z := complex(cos, sin)
	less := complex(2*half*half, -sin) // 1 - z

	vv := m.stepResponse(t, step) + 2*m.half*step.xv // 1 - Φ_vv
	adjugate := function{complex(vv, 0) + less*complex(step.vv, 0), z * complex(step.xv, 0)}
	product := m.times(adjugate, adjugate)
	product = m.times(product, function{z * complex(step.xx, 0), z * complex(step.xv, 0)})
	product = m.times(product, function{complex(m.stepResponse(all, whole), 0), complex(-whole.xv, 0)})
	d := m.denominator(t, theta)
	return -2 * real(product.one/(d*d))
}

// A function of the matrix B = [0 1; -1 -2·half] that generates the motion is
// one + rate·B, since B² = -1 - 2·half·B. Its first row is (one, rate).
type function struct {
	one, rate complex128
}

func (m modes) times(a, b function) function {
	return function{
		one:  a.one*b.one - a.rate*b.rate,
		rate: a.one*b.rate + a.rate*b.one - complex(2*m.half, 0)*a.rate*b.rate,
	}
}

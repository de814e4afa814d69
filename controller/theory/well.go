package theory

import "math"

// A Well is the ideal double well: two parabolas of stiffness 1 about ±a,
// a = √(2·Barrier), joined continuously at the threshold x0 = Offset. Its
// statistics are Boltzmann's; they hold for a loop without delay, band and
// noise at any quality factor, and take the temperature as a ratio t to the
// bath's, so that they also describe a resonator that the loop cools.
// Methods panic if the barrier is outside [0.01, 300] kT, the offset not
// between the well centres, or t not positive.
type Well struct {
	Barrier float64 // of the untilted wells, kT
	Offset  float64 // threshold off the midpoint, σ
}

// Centre returns a = √(2·Barrier), the distance of either centre from the
// midpoint, σ.
func (w Well) Centre() float64 {
	mustBarrier(w.Barrier)
	a := math.Sqrt(2 * w.Barrier)
	if !(math.Abs(w.Offset) < a) {
		panic("theory: threshold not between the well centres")
	}
	return a
}

// Barriers returns the barriers seen from the lower and from the upper
// well, (a+x0)²/2 and (a-x0)²/2, kT.
func (w Well) Barriers() (lower, upper float64) {
	a := w.Centre()
	l, u := a+w.Offset, a-w.Offset
	return l * l / 2, u * u / 2
}

// Halves returns the half partition functions ∫e^{-U/t}dx, σ, below and
// above the threshold, with U = 0 at the threshold. They grow as e^b, and are
// finite for the package's barriers if t > 0.5 or b < 300·t.
func (w Well) Halves(t float64) (lower, upper float64) {
	l, u := w.logHalves(t)
	return math.Exp(l), math.Exp(u)
}

func (w Well) logHalves(t float64) (lower, upper float64) {
	a := w.Centre()
	if !(t > 0) || math.IsInf(t, 1) {
		panic("theory: temperature ratio not positive")
	}
	half := func(d float64) float64 { // d: centre to threshold
		return d*d/(2*t) + math.Log(math.Sqrt(2*math.Pi*t)*upperTail(-d/math.Sqrt(t)))
	}
	return half(a + w.Offset), half(a - w.Offset)
}

// UpperOccupation returns the probability of being above the threshold.
func (w Well) UpperOccupation(t float64) float64 {
	l, u := w.logHalves(t)
	return 1 / (1 + math.Exp(l-u))
}

// ThresholdDensity returns the probability density at the threshold, 1/σ.
func (w Well) ThresholdDensity(t float64) float64 {
	l, u := w.logHalves(t)
	m := math.Max(l, u)
	return math.Exp(-m) / (math.Exp(l-m) + math.Exp(u-m))
}

// MeanAbs returns ⟨|x-x0|⟩, σ.
func (w Well) MeanAbs(t float64) float64 {
	a, p0, up := w.Centre(), w.ThresholdDensity(t), w.UpperOccupation(t)
	// In a half with its centre at distance d: P·d + t·p0.
	return up*(a-w.Offset) + (1-up)*(a+w.Offset) + 2*t*p0
}

// MeanSquare returns ⟨x²⟩ about the midpoint, σ².
func (w Well) MeanSquare(t float64) float64 {
	a, p0, up := w.Centre(), w.ThresholdDensity(t), w.UpperOccupation(t)
	// ⟨(x-x0)²⟩ of a half is P·(d²+t) + t·d·p0, its first moment ±(P·d + t·p0).
	u, l := a-w.Offset, a+w.Offset
	square := up*(u*u+t) + (1-up)*(l*l+t) + t*(u+l)*p0
	first := up*u - (1-up)*l
	return square + 2*w.Offset*first + w.Offset*w.Offset
}

// RiceRate returns the mean number of threshold crossings per unit time in
// both directions, 2·√(t/2π)·p0, ω₀ (S. O. Rice, Bell Syst. Tech. J. 23-24,
// 1944-45; the velocity must be continuous, so raw counts of a sampled
// overdamped record stay below it).
func (w Well) RiceRate(t float64) float64 {
	return 2 * math.Sqrt(t/(2*math.Pi)) * w.ThresholdDensity(t)
}

// BandRate returns the switching rate in both directions, ω₀, when the
// resonator must pass the threshold by h ≥ 0, σ, on the old side's parabola.
// It takes either side to be in equilibrium up to its switching point, hence
// Q ≫ 1 and a loss 2·a·h a crossing small against 2π·b/Q. At h = 0 it is Rice's.
func (w Well) BandRate(t, h float64) float64 {
	a := w.Centre()
	if !(t > 0) || !(h >= 0) {
		panic("theory: temperature ratio or half band out of its domain")
	}
	inverse := func(d float64) float64 { // of the flux out of a side, given that side
		return math.Exp((d+h)*(d+h)/(2*t)) * math.Sqrt(2*math.Pi*t) * upperTail(-d/math.Sqrt(t))
	}
	return 2 * math.Sqrt(t/(2*math.Pi)) / (inverse(a+w.Offset) + inverse(a-w.Offset))
}

// TransitionState returns the transition-state rates, ω₀, out of the lower
// and out of the upper well: the crossings in one direction over the
// occupation of the side they leave. They bound the true rates from above.
func (w Well) TransitionState(t float64) (lower, upper float64) {
	flux, up := w.RiceRate(t)/2, w.UpperOccupation(t)
	return flux / (1 - up), flux / up
}

// SampledCrossing returns the probability that a stationary Gaussian process
// of zero mean has changed sign between two samples whose correlation is
// rho, arccos(rho)/π (Rice, as above). It panics unless -1 ≤ rho ≤ 1.
func SampledCrossing(rho float64) float64 {
	if !(rho >= -1 && rho <= 1) {
		panic("theory: correlation outside [-1, 1]")
	}
	return math.Acos(rho) / math.Pi
}

// upperTail is the probability that a standard normal variate exceeds x.
func upperTail(x float64) float64 { return math.Erfc(x/math.Sqrt2) / 2 }

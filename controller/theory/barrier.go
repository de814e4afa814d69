package theory

import "math"

// NoisyPotential returns the mean potential at x, σ from the threshold, that
// white sensor noise of standard deviation s (σ, new each sample) leaves of
// the symmetric double well, in kT:
//
//	x²/2 - a·[x·erf(x/(√2·s)) + s·√(2/π)·e^{-x²/2s²}].
//
// It holds for sampling fast against ω₀ and Q·ω₀, without dead band. It
// panics unless b is in [0.01, 300] and s not negative.
func NoisyPotential(x, b, s float64) float64 {
	a := mustNoise(b, s)
	if s == 0 {
		return x*x/2 - a*math.Abs(x)
	}
	u := x / (math.Sqrt2 * s)
	return x*x/2 - a*(x*math.Erf(u)+s*math.Sqrt(2/math.Pi)*math.Exp(-u*u))
}

// NoisyBarrier returns the barrier, kT, that white sensor noise of standard
// deviation s (σ) leaves of b: b - a·s·√(2/π), counted from the centres at ±a.
// Range as [NoisyPotential], and s·√(2/π) < a: beyond there are no two wells,
// and the range says so (the value is then 0).
func NoisyBarrier(b, s float64) (float64, Range) {
	a := mustNoise(b, s)
	var r Range
	r.require(s <= a/4, "sensor noise %.3g σ above a quarter of the wells' distance from the midpoint (%.3g σ)", s, a/4)
	return math.Max(0, b-a*s*math.Sqrt(2/math.Pi)), r
}

// BandBarrier returns the barrier, kT, with a dead band of half width h (σ):
// b·(1+h/a)², as the resonator must pass the threshold by h in its old
// parabola. It panics unless b is in [0.01, 300] and h not negative.
func BandBarrier(b, h float64) float64 {
	a := mustNoise(b, h)
	return (a + h) * (a + h) / 2
}

// ApparentBarrier returns what the logarithm of a histogram of noisy
// readings shows as the barrier of an ideal symmetric double well, between
// its centre and its threshold, kT; s is the readings' noise, σ:
//
//	b/(1+s²) - ln[2·Φ(a·s/√(1+s²))].
//
// It is exact for a cusp, when the other well's part at the centre is
// negligible (b above ~2); the noise must not act on the loop. It panics
// unless b is in [0.01, 300] and s not negative.
func ApparentBarrier(b, s float64) float64 {
	a := mustNoise(b, s)
	q := 1 + s*s
	return b/q - math.Log(2*upperTail(-a*s/math.Sqrt(q)))
}

// ToggleProbability returns the chance that one sample's noise of standard
// deviation s trips a comparator of half band h whose signal is at the
// middle of its band: the normal tail Q(h/s). Without noise it is 0, or 1/2
// if there is no band either. It panics unless both are not negative.
func ToggleProbability(h, s float64) float64 {
	switch {
	case !(h >= 0 && s >= 0):
		panic("theory: negative band or noise")
	case h == 0:
		return 0.5
	case s == 0:
		return 0
	}
	return upperTail(h / s)
}

func mustNoise(b, s float64) (a float64) {
	mustBarrier(b)
	if !(s >= 0) || math.IsInf(s, 1) {
		panic("theory: negative or infinite noise or band")
	}
	return math.Sqrt(2 * b)
}

package theory

import "math"

// OverdampedEscape returns ν, the exact slowest decay rate of the odd mode
// of the symmetric cusped double well for Q ≪ 1, in units of Q·ω₀ (the
// inverse relaxation time of a well): the smallest positive root of
// D_ν(-√(2b)) = 0, D the parabolic cylinder function. The rate from well to
// well is half of it. It panics unless b is in [0.01, 300].
func OverdampedEscape(b float64) float64 {
	mustBarrier(b)
	// D_ν(-a) up to a positive factor, by Kummer's functions: Abramowitz and
	// Stegun, Handbook of Mathematical Functions, 19.3 (from memory).
	d := func(nu float64) float64 {
		return kummer(-nu/2, 0.5, b)/math.Gamma((1-nu)/2) +
			2*math.Sqrt(b)*kummer((1-nu)/2, 1.5, b)/math.Gamma(-nu/2)
	}
	// At ν = 1, where D is -a, the first Γ has its pole.
	return firstRoot(d, 1e-3*math.Exp(-b), 1-1e-12)
}

// OverdampedPassage returns the mean time from the bottom of a well to the
// cusp for Q ≪ 1, in units of 1/(Q·ω₀): √π∫₀^√b e^{z²}(1+erf z)dz, the
// Ornstein-Uhlenbeck first passage (A. J. F. Siegert, Phys. Rev. 81, 617
// (1951)). It panics unless b is in [0.01, 300].
func OverdampedPassage(b float64) float64 {
	mustBarrier(b)
	return passageTime(0, math.Sqrt(b))
}

// CuspKramers returns √(b/π)·e^{-b}, the asymptote of [OverdampedEscape] for
// b ≫ 1 (H. A. Kramers, Physica 7, 284 (1940)): 13 % high at 5 kT, 11 % low
// at 1 kT. It panics unless b is in [0.01, 300].
func CuspKramers(b float64) float64 {
	mustBarrier(b)
	return math.Sqrt(b/math.Pi) * math.Exp(-b)
}

// EnergyEscape returns μ, the exact slowest odd decay rate for Q → ∞, in
// units of ω₀/Q: the smallest positive root of M(-μ, 1, b) = 0, M Kummer's
// function. The odd mode vanishes above the barrier. The rate from well to
// well is half of it. It panics unless b is in [0.01, 300].
func EnergyEscape(b float64) float64 {
	mustBarrier(b)
	// As M(-μ,1,b) is close to e^{b/2}·J₀(2√((μ+½)b)), the first root lies
	// below j₀²/4b, and the second far above.
	return firstRoot(func(mu float64) float64 { return kummer(-mu, 1, b) }, 1e-3*math.Exp(-b), 1.45/b+0.5)
}

// EnergyPassage returns the mean time for Q → ∞ from rest to the barrier's
// energy, in units of Q/ω₀: Ei(b) - ln b - γ. It panics unless b is in
// [0.01, 300].
func EnergyPassage(b float64) float64 {
	mustBarrier(b)
	term, s := 1.0, 0.0
	for k := 1.0; k < 5000; k++ {
		term *= b / k
		s += term / k
		if k > b && term/k <= 1e-17*s {
			break
		}
	}
	return s
}

// Depopulation returns A(δ), the factor by which a well that is left over a
// barrier in one direction only is emptied below equilibrium near the top
// (V. I. Mel'nikov and S. V. Meshkov, J. Chem. Phys. 85, 1018 (1986)); δ is
// the mean energy loss from barrier to barrier over k_B·T, 2πb/Q here. It
// panics unless δ is positive.
func Depopulation(delta float64) float64 {
	if !(delta > 0) {
		panic("theory: energy loss not positive")
	}
	// With λ = tan θ/2 the exponent is (2/π)∫ ln(1-e^{-δ/4cos²θ})dθ over a
	// quarter turn; u = π/2-θ. Panels double from far below √δ, under which
	// the integrand vanishes.
	f := func(u float64) float64 {
		s := math.Sin(u)
		return math.Log(-math.Expm1(-delta / (4 * s * s)))
	}
	lo := math.Min(0.1, math.Sqrt(delta)/16)
	total := panels(f, 0, lo, lo)
	for lo < math.Pi/2 {
		hi := math.Min(2*lo, math.Pi/2)
		total += panels(f, lo, hi, hi)
		lo = hi
	}
	return math.Exp(2 / math.Pi * total)
}

// An EscapeBracket is a rate from well to well in the symmetric, ideal
// double well, ω₀, between its bounds.
type EscapeBracket struct {
	Low, High float64
	Range     Range
}

// EscapeRate brackets the rate from well to well of the symmetric double
// well at any Q. For Q ≥ 5 the two bounds are k_TST·A(δ)²/A(2δ) (Mel'nikov
// and Meshkov, high) and the same with its limit for Q → ∞ replaced by the
// exact one, (μ/2Q)·[A²/A(2δ)]/(δ/2) (low): their order swaps below 4 kT,
// where they come within some per cent of the exact rate. Below Q = 5 the
// bounds are the harmonic and the smaller of k_TST and (Q/2)·ν, times
// the same depopulation. The range is 3 ≤ b ≤ 8; it panics unless b is in
// [0.01, 300] and q positive.
func EscapeRate(q, b float64) EscapeBracket {
	mustBarrier(b)
	if !(q > 0) || math.IsInf(q, 1) {
		panic("theory: quality not positive and finite")
	}
	tst, _ := Well{Barrier: b}.TransitionState(1)
	delta := 2 * math.Pi * b / q
	a := Depopulation(delta)
	empty := a * a / Depopulation(2*delta)
	var e EscapeBracket
	if q >= 5 {
		plain, corrected := tst*empty, EnergyEscape(b)/(2*q)*empty/(delta/2)
		e.Low, e.High = math.Min(plain, corrected), math.Max(plain, corrected)
		if b < 4 {
			e.Low, e.High = 0.93*e.Low, 1.06*e.High
		}
	} else {
		spatial := q / 2 * OverdampedEscape(b)
		e.Low = empty / (1/tst + 1/spatial)
		e.High = math.Min(tst*empty*1.06, spatial)
	}
	e.Range.require(b >= 3 && b <= 8, "barrier %.3g kT outside the 3 to 8 kT over which the bounds were compared with exact rates", b)
	return e
}

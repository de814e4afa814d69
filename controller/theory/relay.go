package theory

import "math"

// zetaHalf is -ζ(1/2), the excess of a random walk's first passage
// (DLMF 25.6, from memory).
const zetaHalf = 1.4603545088095868

// RelayDwell returns the mean time between two switchings of a relay with
// thresholds ±h on an overdamped resonator, in units of 1/(Q·ω₀): from -h,
// as seen from the centre's side, to the switching point in the parabola
// whose centre lies d from the middle of the band; d = √(2b) without tilt,
// √(2b)±x0 with. It is the Ornstein-Uhlenbeck first passage
//
//	√π ∫ e^{z²}(1+erf z)dz from (d-h)/√2 to (d+h)/√2
//
// (A. J. F. Siegert, Phys. Rev. 81, 617 (1951)), for Q ≪ h/σ: without
// inertia, h → 0 means endless chatter. It saturates at the largest float64,
// and panics unless d and h are finite and h ≥ 0.
func RelayDwell(d, h float64) float64 {
	if !(h >= 0) || math.IsInf(h, 1) || !(math.Abs(d) < math.Inf(1)) {
		panic("theory: relay distances not finite, or a negative band")
	}
	return passageTime((d-h)/math.Sqrt2, (d+h)/math.Sqrt2)
}

// SampledBand returns the half band, σ, that a comparator asked every dt
// (1/ω₀) has in effect on a resonator without inertia, h+0.5826·√(2D·dt)
// with D = Q: M. Broadie, P. Glasserman and S. Kou, Math. Finance 7, 325
// (1997). It holds for Q ≪ ω₀dt, a shift small against a well's width σ and
// h not small against the shift. It panics unless the arguments are
// not negative.
func SampledBand(h, quality, dt float64) float64 {
	if !(h >= 0 && quality >= 0 && dt >= 0) {
		panic("theory: negative band, quality or tick")
	}
	return h + zetaHalf/math.Sqrt(2*math.Pi)*math.Sqrt(2*quality*dt)
}

// passageTime is √π∫e^{z²}(1+erf z)dz, saturating.
func passageTime(lo, hi float64) float64 {
	peak := math.Max(hi, 0) * math.Max(hi, 0)
	f := func(z float64) float64 { return math.Exp(z*z-peak) * math.Erfc(-z) }
	if lo < -5 {
		// e^{z²}·erfc(-z) ~ 1/(√π·|z|), which overflows as a product far out.
		f = func(z float64) float64 {
			if z < -5 {
				w := 1 / (2 * z * z)
				return math.Exp(-peak) / (math.SqrtPi * -z) * (1 - w*(1-3*w*(1-5*w*(1-7*w))))
			}
			return math.Exp(z*z-peak) * math.Erfc(-z)
		}
	}
	if hi <= lo {
		return 0
	}
	s := math.SqrtPi * panels(f, lo, hi, 0.25)
	return math.Min(s*math.Exp(math.Min(peak, 700)), math.MaxFloat64)
}

// inertialShift returns what has to be added to the half band h so that
// [RelayDwell] counts the switchings of a sampled resonator with inertia.
// Next to the threshold the position moves by sd in a tick, and a flat
// density p0 is crossed p0·√(2/π)·sd times a tick (for ω₀dt ≪ Q that is
// Rice's rate): the near shift gives this rate as h → 0. Between far
// thresholds it is the overshoot of a first passage: 1.4603·Q with inertia
// (T. W. Marshall and E. J. Watson, J. Phys. A 18, 3531 (1985), from memory),
// Broadie's without. Between the limits it interpolates. dt must be positive.
func inertialShift(h, quality, dt float64) float64 {
	near := math.Sqrt(math.Pi/2) * quality * dt / tickSpread(quality, dt)
	const inertial, sampled = zetaHalf * 0.7978845608028654, 2 * zetaHalf / math.Pi // far over near; √(2/π)
	far := sampled + (inertial-sampled)*math.Exp(-dt/quality)
	return near * (1 + h/(h+near)*(far-1))
}

// tickSpread is the standard deviation of the free resonator's displacement
// over dt (L. S. Ornstein).
func tickSpread(quality, dt float64) float64 {
	theta := dt / quality
	if theta < 1e-3 {
		return dt * math.Sqrt(1-theta/3)
	}
	return quality * math.Sqrt(2*(theta+math.Expm1(-theta)))
}

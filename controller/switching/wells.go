package switching

import "math"

// IdealMidpoint returns the midpoint, in metres, between the mean positions on
// the two sides of a threshold x0, for wells at ±x1 of thermal width σ that
// are each cut off at the threshold, in equilibrium:
//
//	M = σ/2 · [h((x1 - x0)/σ) - h((x1 + x0)/σ)],  h(α) = φ(α)/Φ(α),
//
// from the mean of a truncated normal distribution (N.L. Johnson and S. Kotz,
// Continuous Univariate Distributions 1, 1970, ch. 13; from memory). It is zero
// without a tilt. All lengths in metres from the middle between the wells.
func IdealMidpoint(x1, x0, sigma float64) float64 {
	h := func(alpha float64) float64 {
		return math.Sqrt(2/math.Pi) * math.Exp(-alpha*alpha/2) / math.Erfc(-alpha/math.Sqrt2)
	}
	return sigma / 2 * (h((x1-x0)/sigma) - h((x1+x0)/sigma))
}

// Wells is what a Keeper's proposal rests on.
type Wells struct {
	Rate         float64 // ticks, 1/s
	Omega0       float64 // of either well, rad/s
	Quality      float64
	Sigma        float64 // thermal width of either well, m
	HalfDistance float64 // x1, from the midpoint to either well, m
	Threshold    float64 // wanted, from the midpoint, m
	Dwell        float64 // expected mean dwell time in the well with the longer one, s
}

// What ProposeKeeper aims at.
const (
	proposedTilt   = 0.01 // scatter of the tilt by that of the threshold, kT
	proposedDwells = 30   // longer dwell times in a time constant
	proposedMemory = 100  // relaxation times in a time constant
)

// ProposeKeeper returns a KeeperConfig with the shortest time constant that
// keeps the scatter of the tilt below about 0.01 kT and holds thirty of the
// longer dwell times and a hundred relaxation times max(Q, 1/Q)/ω0. The
// threshold is frozen after a time constant without a visit, which chance
// brings about once in e³⁰ dwells; the bound is the distance from the midpoint
// to a well. Where the dwell time is unknown, not a number, or infinite, no
// Keeper can be made from what it returns.
func ProposeKeeper(w Wells) KeeperConfig {
	// A threshold off by s tilts by 2·k·x1·s, and s scatters by
	// σ/√(Q·ω0·T) in wells that are visited equally.
	scatter := proposedTilt * w.Sigma / (2 * w.HalfDistance) // in sigma
	seconds := max(
		1/(w.Quality*w.Omega0*scatter*scatter),
		proposedDwells*w.Dwell,
		proposedMemory*max(w.Quality, 1/w.Quality)/w.Omega0,
	)
	ticks := max(seconds*w.Rate, LeastTimeConstant)
	return KeeperConfig{
		ExpectedMidpoint: IdealMidpoint(w.HalfDistance, w.Threshold, w.Sigma),
		TimeConstant:     ticks,
		Bound:            w.HalfDistance,
		Unvisited:        ticks,
	}
}

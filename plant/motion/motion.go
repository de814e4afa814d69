// Package motion holds the exact statistics of the damped harmonic oscillator
// in thermal equilibrium with its surroundings: how its mean moves over a
// step, the covariance of what the thermal force adds meanwhile, and the
// spectrum of its position, sampled or not.
//
// It is arithmetic alone: it holds no state, draws no random numbers and
// imports nothing of ours, so that both what simulates the motion and what
// predicts it may use it. Quantities are SI.
//
// Everything follows from
//
//	m·x″ = -k·x - m·Γ·x′ + √(2·m·Γ·k_B·T)·ξ(t),  ⟨ξ(t)ξ(s)⟩ = δ(t-s),
//
// with ω₀² = k/m and Γ = ω₀/Q. Its exact solution between two samples, and the
// spectrum of the samples, are given by S. F. Nørrelykke and H. Flyvbjerg,
// Phys. Rev. E 83, 041103 (2011), https://doi.org/10.1103/PhysRevE.83.041103
// (formulas from memory). Their covariance is a difference of nearly equal
// numbers where the step is short; the forms used here are not. The accuracies
// stated were measured for Q from 1e-3 to 1e6 and ω₀·dt from 1e-9 up.
//
// All functions are safe for use by several goroutines at once. They panic, as
// a bug of the caller, if a field of the Oscillator that they use lies outside
// the range stated for it.
package motion

import "math"

// An Oscillator is a mass on a spring with viscous damping at a given
// temperature.
type Oscillator struct {
	Omega0    float64 // undamped angular frequency √(k/m), rad/s; positive
	Quality   float64 // quality factor Q = ω₀/Γ; positive
	Stiffness float64 // spring constant k, N/m; positive
	KT        float64 // thermal energy k_B·T, J; not negative
}

// Damping returns the damping rate Γ = ω₀/Q in 1/s.
func (o Oscillator) Damping() float64 {
	requirePositive(o.Omega0, "Omega0")
	requirePositive(o.Quality, "Quality")
	return o.Omega0 / o.Quality
}

// Mass returns the mass m = k/ω₀² in kg.
func (o Oscillator) Mass() float64 {
	requirePositive(o.Omega0, "Omega0")
	requirePositive(o.Stiffness, "Stiffness")
	return o.Stiffness / o.Omega0 / o.Omega0
}

// variance returns ⟨x²⟩ = k_B·T/k in m².
func (o Oscillator) variance() float64 {
	requirePositive(o.Stiffness, "Stiffness")
	if !(o.KT >= 0 && !math.IsInf(o.KT, 1)) {
		panic("motion: KT is negative or not finite")
	}
	return o.KT / o.Stiffness
}

// turn returns ω₀·dt, having checked both.
func (o Oscillator) turn(dt float64) float64 {
	requirePositive(o.Omega0, "Omega0")
	if !(dt >= 0) {
		panic("motion: dt is negative or not a number")
	}
	turn := o.Omega0 * dt
	if math.IsInf(turn, 1) {
		panic("motion: dt is not finite, or too long")
	}
	return turn
}

func requirePositive(value float64, name string) {
	if !(value > 0 && !math.IsInf(value, 1)) {
		panic("motion: " + name + " is not positive and finite")
	}
}

// Package theory predicts what a threshold-switched feedback loop does to
// the double well that it makes: the temperature at which the resonator
// settles, how often it is switched and escapes, the barrier that a late,
// banded or noisy comparator leaves, and how many crossings a run will show.
//
// Everything is in reduced units: length σ = √(k_B·T/k), time 1/ω₀, energy
// k_B·T, with k the stiffness of each well, T the bath's temperature and
// ω₀² = k/m. In these units the well centres lie at ±a with a = √(2b), b the
// barrier of the untilted double well, and the damping rate is 1/Q.
//
// Every prediction carries the range in which it holds ([Range]); outside
// it the number is finite, and says that it is outside. The package knows
// nothing of loops that run, of devices or of SI units: of this project's
// packages it may import controller/... only.
package theory

package motion_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/integrate/quad"

	"brinkwell/plant/motion"
)

func TestSpectrumAtMarkedFrequencies(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.5, 35, 1e6} {
		o := bench(quality)
		// Response theory: S = 4·k_B·T·m·Γ·|χ|², χ = 1/k at rest and Q/k at ω₀.
		force := 4 * o.KT * o.Mass() * o.Damping()
		if got, want := o.Spectrum(0), force/o.Stiffness/o.Stiffness; !within(got, want, 1e-15) {
			t.Errorf("Q = %g: Spectrum(0) = %v, want %v", quality, got, want)
		}
		peak := quality / o.Stiffness
		// Rounding of ω₀ moves the peak by 1e-16·Q of its width, to second order.
		if got, want := o.Spectrum(-o.Omega0/(2*math.Pi)), force*peak*peak; !within(got, want, 2e-15) {
			t.Errorf("Q = %g: Spectrum(f0) = %v, want %v", quality, got, want)
		}
	}
}

func TestSpectrumFarAbove(t *testing.T) {
	// Two-sided values at f = 9 for m = k = k_B·T = 1, seven digits; source as
	// for sampledTable.
	for _, row := range []struct{ quality, want float64 }{
		{0.2, 9.709524e-7}, {0.5, 3.909299e-7}, {10, 1.957090e-8}, {1000, 1.957096e-10},
	} {
		if got := unit(row.quality).Spectrum(9); !within(got, 2*row.want, 3e-7) {
			t.Errorf("Q = %g: Spectrum(9) = %v, want %v", row.quality, got, 2*row.want)
		}
	}
}

// Two-sided aliased spectrum for m = k = k_B·T = 1, dt = 0.05: 40-digit mpmath
// evaluation of an ARMA(2,1) form derived for it, cross-checked there with the
// sum over aliases; the result is that of Nørrelykke and Flyvbjerg, Phys.
// Rev. E 83, 041103 (2011) (from memory).
var sampledTable = []struct {
	quality float64
	want    [6]float64 // at 0, 0.01, 1/(2π), 1, 9 and 10
}{
	{0.5, [6]float64{4.000000034718, 3.968603346462, 1.000000034739, 2.441289373826e-3, 5.737600323493e-7, 5.205730154521e-7}},
	{10, [6]float64{0.2000000017363, 0.2015805178921, 20.00000000174, 1.350471799161e-4, 2.871976529752e-8, 2.605462727269e-8}},
}

func TestSampledSpectrumTable(t *testing.T) {
	for _, row := range sampledTable {
		for i, f := range []float64{0, 0.01, 1 / (2 * math.Pi), 1, 9, 10} {
			// Half a unit in the last of 13 digits.
			if got, want := unit(row.quality).SampledSpectrum(f, 0.05), 2*row.want[i]; !within(got, want, 6e-13) {
				t.Errorf("Q = %g: SampledSpectrum(%g) = %v, want %v", row.quality, f, got, want)
			}
		}
	}
}

// aliased is the definition of the sampled spectrum: the sum of the continuous
// one over f + n/dt. All terms are positive. Those far out are summed by an
// integral over 1/f, where the spectrum is smooth; the midpoint rule that this
// inverts errs by 1e-9 of what they add, which is less than 1e-4 of the sum.
func aliased(o motion.Oscillator, f, dt float64) float64 {
	const terms = 20000
	far := func(shift float64) float64 {
		inverse := func(u float64) float64 { return dt * o.Spectrum(1/u) / (u * u) }
		return quad.Fixed(inverse, 0, dt/(terms+0.5+shift*dt), 30, quad.Legendre{}, 0)
	}
	sum := far(f) + far(-f)
	for n := terms; n > 0; n-- {
		sum += o.Spectrum(f+float64(n)/dt) + o.Spectrum(f-float64(n)/dt)
	}
	return sum + o.Spectrum(f)
}

// fromPeak returns how far, in radians, the angle theta a sample is from the
// nearest alias of the spectrum's peak, and at least the peak's half width.
func fromPeak(quality, turn, theta float64) float64 {
	if quality <= 0.5 {
		return math.Hypot(math.Remainder(theta, 2*math.Pi), quality*turn)
	}
	up, down := math.Remainder(theta-turn, 2*math.Pi), math.Remainder(theta+turn, 2*math.Pi)
	return math.Hypot(min(math.Abs(up), math.Abs(down)), turn/(2*quality))
}

// phaseError is the relative error of a sampled spectrum that comes from the
// rounding of theta and, where there is a resonance, of its angle turn: each to
// about 1e-16 of itself, and the spectrum goes as fromPeak to the power -2.
func phaseError(quality, turn, theta float64) float64 {
	angle := theta
	if quality > 0.5 {
		angle += turn
	}
	return 4e-16 * angle / fromPeak(quality, turn, theta)
}

func TestSampledSpectrumIsTheAliasSum(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.1, 0.5 - 1e-12, 0.5, 0.5 + 1e-12, 0.7, 3, 10, 1e3, 1e6} {
		for _, turn := range []float64{1e-6, 1e-3, 0.05, 0.3, 1, 2, 3.1, math.Pi, 5, 10} {
			o := bench(quality)
			dt := turn / o.Omega0
			f0 := o.Omega0 / (2 * math.Pi)
			for _, f := range []float64{
				0, 1e-6 / dt, 0.1 / dt, 0.3 / dt, 0.5 / dt,
				0.5 * f0, f0 * (1 - 0.5/max(quality, 1)), f0, f0 * (1 + 1e-3), 2 * f0,
			} {
				// A dozen roundings each here and there, and those of the phases.
				tol := 6e-15 + phaseError(quality, turn, 2*math.Pi*f*dt)
				if got, want := o.SampledSpectrum(f, dt), aliased(o, f, dt); !within(got, want, tol) {
					t.Errorf("Q = %g, turn %g: SampledSpectrum(%g) = %v, want %v: off by %.1e",
						quality, turn, f, got, want, math.Abs(got/want-1))
				}
			}
		}
	}
}

func TestSampledSpectrumHoldsTheVariance(t *testing.T) {
	for _, quality := range []float64{0.01, 0.5, 10, 100} {
		for _, turn := range []float64{0.1, 0.5, 3, 7} {
			o := bench(quality)
			dt := turn / o.Omega0
			// The spectrum is even and periodic, so that the trapezoidal rule with
			// n intervals errs only by the correlation at lags of 2n·dt: here e^-35
			// and less.
			values := make([]float64, int(35*max(quality, 1/quality)/turn)+2)
			spacing := 0.5 / (float64(len(values)-1) * dt)
			for i := range values {
				values[i] = o.SampledSpectrum(float64(i)*spacing, dt)
			}
			values[0] /= 2
			values[len(values)-1] /= 2
			// Each value carries up to 1e-15·Q of rounding where it is largest.
			got, want := floats.SumCompensated(values)*spacing, o.KT/o.Stiffness
			if tol := 1e-14 + 1e-15*quality; !within(got, want, tol) {
				t.Errorf("Q = %g, turn %g: integral %v, want kT/k = %v", quality, turn, got, want)
			}
		}
	}
}

func TestSampledSpectrumIsEvenAndPeriodic(t *testing.T) {
	o, dt := bench(10), 4e-6
	want := o.SampledSpectrum(6600, dt)
	for _, f := range []float64{-6600, 1/dt - 6600, 1/dt + 6600} {
		// f·dt rounds to 1e-16, seen through a resonance of width 1/Q and a
		// phase of 0.16.
		if got := o.SampledSpectrum(f, dt); !within(got, want, 1e-13) {
			t.Errorf("SampledSpectrum(%g) = %v, want %v", f, got, want)
		}
	}
}

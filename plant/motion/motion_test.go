package motion_test

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"

	"brinkwell/plant/motion"
)

// within reports whether got is want to the relative tolerance tol. NaN fails.
func within(got, want, tol float64) bool {
	return math.Abs(got-want) <= tol*math.Abs(want)
}

// unit is the oscillator with m = k = k_B·T = 1.
func unit(quality float64) motion.Oscillator {
	return motion.Oscillator{Omega0: 1, Quality: quality, Stiffness: 1, KT: 1}
}

// bench is one of a laboratory's size, so that units are tested too.
func bench(quality float64) motion.Oscillator {
	return motion.Oscillator{Omega0: 2 * math.Pi * 6500, Quality: quality, Stiffness: 0.08, KT: 4.047e-21}
}

// grid calls f for all kinds of damping and steps, among them steps near both
// sides of each switch of formulas and qualities near both sides of 1/2.
func grid(f func(quality, turn float64)) {
	qualities := []float64{1e-3, 0.01, 0.1, 0.3, 0.49, 0.51, 0.6, 0.7, 1, 2, 3, 5, 10, 1e3, 1e6}
	for _, d := range []float64{0, 1e-15, 1e-12, 1e-8, 1e-5, 1e-3} {
		qualities = append(qualities, 0.5*(1-d), 0.5*(1+d))
	}
	turns := []float64{
		1e-9, 1e-6, 1e-4, 1e-3, 2.9e-3, 3.1e-3, 0.01, 0.05, 0.3, 0.7, 1, 1.5,
		2, 2.99, 3.01, math.Pi, 4, 5, 2 * math.Pi, 6.283, 6.2832, 7, 12, 30, 100,
	}
	for _, q := range qualities {
		for _, t := range turns {
			f(q, t)
		}
	}
}

// anyMotion draws an oscillator and half a step of it.
func anyMotion(t *rapid.T) (o motion.Oscillator, dt float64) {
	o = unit(math.Pow(10, rapid.Float64Range(-3, 6).Draw(t, "log10 quality")))
	return o, math.Pow(10, rapid.Float64Range(-9, 1).Draw(t, "log10 turn"))
}

func mustPanic(t *testing.T, what string, f func()) {
	t.Helper()
	defer func() {
		if recover() == nil {
			t.Errorf("%s: no panic", what)
		}
	}()
	f()
}

func TestDampingAndMass(t *testing.T) {
	o := bench(35)
	// Definitions; two roundings each.
	if got, want := o.Damping()*o.Quality, o.Omega0; !within(got, want, 4e-16) {
		t.Errorf("Damping·Quality = %v, want %v", got, want)
	}
	if got, want := o.Mass()*o.Omega0*o.Omega0, o.Stiffness; !within(got, want, 8e-16) {
		t.Errorf("Mass·Omega0² = %v, want %v", got, want)
	}
}

func TestBadArgumentsPanic(t *testing.T) {
	good := unit(10)
	for _, bad := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		name := fmt.Sprint(bad)
		mustPanic(t, "Omega0 "+name, func() { o := good; o.Omega0 = bad; o.Propagate(1) })
		mustPanic(t, "Omega0 "+name, func() { o := good; o.Omega0 = bad; o.Damping() })
		mustPanic(t, "Quality "+name, func() { o := good; o.Quality = bad; o.Propagate(1) })
		mustPanic(t, "Quality "+name, func() { o := good; o.Quality = bad; o.Damping() })
		mustPanic(t, "Stiffness "+name, func() { o := good; o.Stiffness = bad; o.Noise(1) })
		mustPanic(t, "Stiffness "+name, func() { o := good; o.Stiffness = bad; o.Mass() })
		mustPanic(t, "sampling step "+name, func() { good.SampledSpectrum(0, bad) })
		mustPanic(t, "sampling step "+name, func() { good.MeanPeriodogram(0, 1, bad) })
		if bad == 0 {
			continue // no step and no thermal energy are allowed
		}
		mustPanic(t, "KT "+name, func() { o := good; o.KT = bad; o.Noise(1) })
		mustPanic(t, "step "+name, func() { good.Propagate(bad) })
		mustPanic(t, "step "+name, func() { good.StepResponse(bad) })
		mustPanic(t, "step "+name, func() { good.Noise(bad) })
		if bad == -1 {
			continue // a lag or a frequency may have either sign
		}
		mustPanic(t, "lag "+name, func() { good.Correlation(bad) })
		mustPanic(t, "frequency "+name, func() { good.Spectrum(bad) })
		mustPanic(t, "frequency "+name, func() { good.SampledSpectrum(bad, 1) })
	}
	mustPanic(t, "an infinite turn", func() { o := good; o.Omega0 = 1e200; o.Propagate(1e200) })
	mustPanic(t, "no samples", func() { good.MeanPeriodogram(0, 0, 1) })
	mustPanic(t, "a negative bin", func() { good.MeanPeriodogram(-1, 8, 1) })
	mustPanic(t, "a bin above the Nyquist frequency", func() { good.MeanPeriodogram(5, 8, 1) })
}

// An oscillator at rest is left by its centre, which jumps by 1 nm. Half a
// period later it has swung past the new centre by nearly as much again.
func ExampleOscillator_StepResponse() {
	o := motion.Oscillator{Omega0: 2 * math.Pi * 1000, Quality: 100, Stiffness: 0.1, KT: 4e-21}
	for _, dt := range []float64{0, 1e-6, 0.25e-3, 0.5e-3} {
		dx, dv := o.StepResponse(dt)
		fmt.Printf("%3.0f us: %8.5f nm %6.3f um/s\n", dt*1e6, dx, dv*1e-3)
	}
	// Output:
	//   0 us:  0.00000 nm  0.000 um/s
	//   1 us:  0.00002 nm  0.039 um/s
	// 250 us:  0.99502 nm  6.234 um/s
	// 500 us:  1.98441 nm  0.000 um/s
}

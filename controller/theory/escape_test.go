package theory

import (
	"math"
	"testing"
)

// 12-digit roots and integrals from a 40-digit mpmath evaluation of the
// formulas in the doc comments; nu also by finite elements.
func TestEscapeLimits(t *testing.T) {
	for _, c := range []struct{ b, nu, tau, cusp float64 }{
		{1, 0.234233871734, 4.03772833296, 0.2075537487},
		{2, 0.0972745958588, 10.428409398, 0.107981933},
		{5, 0.00749428644199, 134.287085954, 0.008500366603},
		{10, 7.63805400021e-5, 13093.6865505, 8.099910956e-5},
	} {
		// Digits given.
		if got := OverdampedEscape(c.b); !within(got, c.nu, 1e-11) {
			t.Errorf("OverdampedEscape(%g) = %v, want %v", c.b, got, c.nu)
		}
		if got := OverdampedPassage(c.b); !within(got, c.tau, 1e-11) {
			t.Errorf("OverdampedPassage(%g) = %v, want %v", c.b, got, c.tau)
		}
		if got := CuspKramers(c.b); !within(got, c.cusp, 1e-8) {
			t.Errorf("CuspKramers(%g) = %v, want %v", c.b, got, c.cusp)
		}
	}
	for b, mu := range map[float64]float64{
		2: 0.329478459354, 3: 0.137421230524, 4: 0.0611042648395, 5: 0.0274730399962,
		6: 0.0122316001636, 8: 0.00229659498897, 10: 4.02133516936e-4,
		1: 1, // M(-1,1,b) = 1-b
	} {
		if got := EnergyEscape(b); !within(got, mu, 1e-11) {
			t.Errorf("EnergyEscape(%g) = %v, want %v", b, got, mu)
		}
	}
	for b, tau := range map[float64]float64{3: 8.25800462, 5: 37.99862178, 8: 437.72324233} {
		if got := EnergyPassage(b); !within(got, tau, 2e-9) {
			t.Errorf("EnergyPassage(%g) = %v, want %v", b, got, tau)
		}
	}
}

// Both ends of the domain stay finite and positive.
func TestEscapeEnds(t *testing.T) {
	for _, b := range []float64{minBarrier, maxBarrier} {
		for name, f := range map[string]func(float64) float64{
			"OverdampedEscape": OverdampedEscape, "OverdampedPassage": OverdampedPassage,
			"EnergyEscape": EnergyEscape, "EnergyPassage": EnergyPassage, "CuspKramers": CuspKramers,
		} {
			if got := f(b); !(got > 0 && got < math.Inf(1)) {
				t.Errorf("%s(%g) = %v", name, b, got)
			}
		}
	}
}

func TestDepopulation(t *testing.T) {
	// Ten-digit quadrature of the published integral.
	for _, c := range []struct{ delta, a, double float64 }{
		{1e-4, 0.0000991795, 0.0000497593},
		{1e-3, 0.0009742823, 0.0004924266},
		{0.01, 0.0092092019, 0.0047643727},
		{math.Pi / 100, 0.0271488296, 0.0144194384},
		{0.1, 0.0770869196, 0.0429116803},
		{0.3, 0.1913503847, 0.1150042217},
		{1, 0.4429783100, 0.3061931474},
		{3, 0.7564307983, 0.6269979083},
		{10, 0.9741714976, 0.9505005468},
		{30, 0.9998924730, 0.9997850007},
	} {
		a := Depopulation(c.delta)
		if !(math.Abs(a-c.a) <= 6e-11) { // half a unit of the tenth digit
			t.Errorf("Depopulation(%g) = %.11f, want %.10f", c.delta, a, c.a)
		}
		if got := a * a / Depopulation(2*c.delta); !(math.Abs(got-c.double) <= 6e-11) {
			t.Errorf("A²/A(2δ) at %g = %.11f, want %.10f", c.delta, got, c.double)
		}
	}
	// A ~ δ(1-0.8239√δ), 0.8239 = |ζ(1/2)|/√π, for small δ; the next order is δ.
	if got := Depopulation(1e-8) / 1e-8; !(math.Abs(got-(1-zetaHalf/math.SqrtPi*1e-4)) <= 1e-7) {
		t.Errorf("Depopulation(1e-8)/1e-8 = %v", got)
	}
}

// kleinKramers holds λ1 (half is the rate from well to well), ω₀: Hermite
// functions in v times finite elements in x, odd mode on the half line, with
// relative errors below 1e-5 for Q ≤ 5 and 4e-4 for Q = 10 to 100.
var kleinKramers = []struct{ q, b, lambda float64 }{
	{0.1, 3, 4.0477116e-3},
	{0.1, 5, 7.0415213e-4},
	{1, 3, 1.5919224e-2},
	{1, 5, 2.0976188e-3},
	{10, 3, 7.72531e-3},
	{10, 5, 1.301059e-3},
	{100, 3, 1.15320e-3},
	{100, 5, 2.20295e-4},
}

func TestEscapeRateBrackets(t *testing.T) {
	for _, c := range kleinKramers {
		e := EscapeRate(c.q, c.b)
		if k := c.lambda / 2; !(e.Low <= k && k <= e.High) || !e.Range.Inside() {
			t.Errorf("Q %g, b %g: exact %.5g outside [%.5g, %.5g] (%v)", c.q, c.b, k, e.Low, e.High, e.Range.Reasons)
		}
		// The bounds must say something.
		if !(e.High < 1.6*e.Low) {
			t.Errorf("Q %g, b %g: bounds [%.5g, %.5g] too wide", c.q, c.b, e.Low, e.High)
		}
	}
	for _, b := range []float64{2.9, 8.1} {
		if EscapeRate(10, b).Range.Inside() {
			t.Errorf("b = %g counted as inside", b)
		}
	}
	// Known errors of the plain formula at 5 kT: +2 % at Q = 5, +6 % at 10,
	// +17 % at 100; of the corrected one -14 % at 10, -5 % at 100 (rounded).
	for _, c := range []struct{ q, exact, low, high float64 }{{10, 1.301059e-3 / 2, -0.14, 0.06}, {100, 2.20295e-4 / 2, -0.05, 0.17}} {
		e := EscapeRate(c.q, 5)
		if !(math.Abs(e.Low/c.exact-1-c.low) <= 0.006 && math.Abs(e.High/c.exact-1-c.high) <= 0.006) {
			t.Errorf("Q %g: errors %.3f and %.3f, want %.2f and %.2f", c.q, e.Low/c.exact-1, e.High/c.exact-1, c.low, c.high)
		}
	}
}

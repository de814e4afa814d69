package theory

import (
	"math"
	"testing"
)

func TestRelayDwell(t *testing.T) {
	// Units 1/(Q·ω₀), b = 2: a quadrature of Siegert's integral, to the
	// digits given.
	for h, want := range map[float64]float64{0.02: 0.724257, 0.1: 3.651016, 0.2: 7.491063, 0.5: 22.399355, 1: 84.8382} {
		if got := RelayDwell(2, h); !within(got, want, 1e-6) {
			t.Errorf("RelayDwell(2, %g) = %v, want %v", h, got, want)
		}
	}
	// h → 0: 2h·√(π/2)·e^b·(1+erf√b).
	want := 2e-6 * math.Sqrt(math.Pi/2) * math.Exp(2) * (1 + math.Erf(math.Sqrt2))
	if got := RelayDwell(2, 1e-6); !within(got, want, 1e-5) {
		t.Errorf("small band %v, want %v", got, want)
	}
	// The asymptote meets the integrand where it takes over, and far out
	// nothing overflows.
	f := func(z float64) float64 { return math.Exp(z*z) * math.Erfc(-z) }
	if got, want := passageTime(-6, -4), math.SqrtPi*panels(f, -6, -4, 0.1); !within(got, want, 1e-6) { // five terms of the asymptote at z = -5
		t.Errorf("passageTime(-6, -4) = %v, want %v", got, want)
	}
	for _, h := range []float64{0, 60, 1e3} {
		if got := RelayDwell(20, h); !(got >= 0 && got <= math.MaxFloat64) {
			t.Errorf("RelayDwell(20, %g) = %v", h, got)
		}
	}
}

func TestSampledBand(t *testing.T) {
	// b = 2, h = 0.5, time in 1/(Q·ω₀): with samples every 0.004 and 0.001 the
	// formula gives 25.92 and 24.11 (Monte Carlo of the sampled relay: 25.54, 24.06).
	const q = 0.01
	for dt, want := range map[float64]float64{0.004: 25.92, 0.001: 24.11} {
		if got := RelayDwell(2, SampledBand(0.5, q, dt/q)); !within(got, want, 3e-4) {
			t.Errorf("dt %g: %v, want %v", dt, got, want)
		}
	}
}

// The two limits of the shift: Rice's rate with inertia, and Broadie's walk.
func TestInertialShift(t *testing.T) {
	const q = 0.01
	if got := inertialShift(0, q, 1e-5); !within(got, math.Sqrt(math.Pi/2)*q, 1e-3) { // θ/6 of it
		t.Errorf("near shift %v", got)
	}
	if got := inertialShift(100, q, 1e-5); !within(got, zetaHalf*q, 2e-3) {
		t.Errorf("far shift %v", got)
	}
	if got, want := inertialShift(100, 1e-6, 1), SampledBand(0, 1e-6, 1); !within(got, want, 1e-3) {
		t.Errorf("far shift without inertia %v, want %v", got, want)
	}
}

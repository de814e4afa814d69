package controller_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
)

// firstPassage is the mean time, in relaxation times γ/k, between two
// switchings of a relay with thresholds ±h on an overdamped particle whose
// well centres lie at ±a: the Ornstein-Uhlenbeck first passage
//
//	T = √π ∫ e^{z²}(1 + erf z)dz from (a-h)/√2 to (a+h)/√2
//
// of A. J. F. Siegert, Phys. Rev. 81, 617 (1951) (formula from memory).
func firstPassage(a, h float64) float64 {
	return math.SqrtPi * quad.Fixed(func(z float64) float64 { return math.Exp(z*z) * (1 + math.Erf(z)) },
		(a-h)/math.Sqrt2, (a+h)/math.Sqrt2, 60, nil, 0)
}

// The reference at b = 2 against values from adaptive quadrature in another
// language, to their digits.
func TestFirstPassage(t *testing.T) {
	for _, c := range []struct{ h, want float64 }{
		{0.02, 0.724257}, {0.1, 3.651016}, {0.2, 7.491063}, {0.5, 22.399355}, {1, 84.8382},
	} {
		if got := firstPassage(2, c.h); !(math.Abs(got/c.want-1) < 1e-6) {
			t.Errorf("h = %g: %.6f, want %.6f", c.h, got, c.want)
		}
	}
}

// The raw dwell time of an overdamped resonator under a comparator with a dead
// band that is asked once a tick. Sampling moves a switching point of a
// diffusion out by 0.5826·√(2·D·dt), D = Q in reduced units (M. Broadie, P.
// Glasserman and S. Kou, Math. Finance 7, 325 (1997); 0.5826 = -ζ(1/2)/√(2π)),
// and with no latency the next dwell starts as far out, in the mean, as the
// last one ended: both ends of T move. At these ticks the shift lengthens the
// dwell by 14 % and 8 %, seven and three standard errors; what the approximation
// neglects is 0.2 % (24.06 by simulation against 24.11 at h = 0.5).
//
// Inertia: Q = 1e-3 makes the thermal velocity last 1e-3 of a tick, and the
// path 1e-3 σ long meanwhile, 0.5 % of h at most.
func TestOverdampedDwell(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, h := range []float64{0.2, 0.5} {
		t.Run(fmt.Sprintf("h=%g", h), func(t *testing.T) {
			t.Parallel()
			const quality = 1e-3
			b := bench{quality: quality, barrier: 2, dt: 0.001 / quality, band: h, seed: uint64(10 + i)}
			m, ticks := newMeter(b, 80e6)
			b.run(t, ticks, m)
			want := firstPassage(b.centre(), h+0.5826*math.Sqrt(2*quality*b.dt))
			perTick, se := m.of(sumEvents)
			dwell := 0.001 / perTick
			near(t, "dwell time", dwell, dwell*se/perTick, want, 0)
			t.Logf("without the sampling shift %.3f", firstPassage(b.centre(), h))
		})
	}
}

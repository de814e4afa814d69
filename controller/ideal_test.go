package controller_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

// boltzmann is e^{-U}, U the parabola of the position's side with the two made
// equal at the threshold.
func (b bench) boltzmann(x float64) float64 {
	centre := math.Copysign(b.centre(), x-b.threshold)
	return math.Exp(((b.threshold-centre)*(b.threshold-centre) - (x-centre)*(x-centre)) / 2)
}

// integral is that of f·e^{-U} over a stretch on one side of the threshold.
func (b bench) integral(from, to float64, f func(x float64) float64) float64 {
	return quad.Fixed(func(x float64) float64 { return f(x) * b.boltzmann(x) }, from, to, 200, nil, 0)
}

func one(float64) float64 { return 1 }

// A loop with ticks so short that half of one as a delay is nothing makes the
// potential that was asked: Boltzmann's density, and the crossings of Rice.
//
// The half tick lowers the temperature by about
// 2·Q·(dt/2)·√(2b)·e^{-b}/(√(2π)(1+erf√b)), some 0.1·Q·dt/2 here: below a
// quarter of the standard error of ⟨v²⟩.
func TestIdealLoopMakesTheDoubleWell(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for _, c := range []struct {
		bench bench
		ticks int64
	}{
		{bench{quality: 0.5, barrier: 2, dt: 0.01, seed: 1}, 20e6},
		{bench{quality: 5, barrier: 2, dt: 0.004, seed: 2}, 40e6},
		{bench{quality: 0.5, barrier: 1.5, dt: 0.01, threshold: 0.15, seed: 3}, 20e6},
	} {
		t.Run(fmt.Sprintf("Q=%g/b=%g/threshold=%g", c.bench.quality, c.bench.barrier, c.bench.threshold), func(t *testing.T) {
			t.Parallel()
			m, ticks := newMeter(c.bench, c.ticks)
			c.bench.run(t, ticks, m)
			checkDensity(t, m)
			checkCrossings(t, m)
		})
	}
}

func checkDensity(t *testing.T, m *meter) {
	b := m.bench
	a, x0 := b.centre(), b.threshold
	lower, upper := b.integral(-a-9, x0, one), b.integral(x0, a+9, one)
	all := func(f func(x float64) float64) float64 {
		return (b.integral(-a-9, x0, f) + b.integral(x0, a+9, f)) / (lower + upper)
	}
	meanAbs := all(func(x float64) float64 { return math.Abs(x - x0) })
	meanSquare := all(func(x float64) float64 { return x * x })
	if x0 == 0 {
		// Closed forms of the symmetric double well: ⟨|x|⟩ = x1 + σ·φ(a)/Φ(a),
		// ⟨x²⟩ = σ²·(1 + a² + a·φ(a)/Φ(a)), the mean values of a normal
		// distribution cut off at 0 (derived). 1e-9 is the quadrature's.
		n := distuv.UnitNormal
		if d := meanAbs - (a + n.Prob(a)/n.CDF(a)); !(math.Abs(d) < 1e-9) {
			t.Fatalf("quadrature of <|x|> is off by %g", d)
		}
		if d := meanSquare - (1 + a*a + a*n.Prob(a)/n.CDF(a)); !(math.Abs(d) < 1e-9) {
			t.Fatalf("quadrature of <x²> is off by %g", d)
		}
	}
	check := func(name string, k int, want float64) {
		got, se := m.of(k)
		near(t, name, got, se, want, 0)
	}
	check("<|x - x0|>", sumAbs, meanAbs)
	check("<x²>", sumSquare, meanSquare)
	check("<v²>", sumVelocity, 1)
	check("share above", sumUpper, upper/(lower+upper))

	// A bin's share of its side: the count less what the side's count lets
	// expect is 0 in the mean, and free of the slow exchange between the wells.
	for k := range 2 * bins {
		from := x0 + float64(k-bins)/4
		side := lower
		if k >= bins {
			side = upper
		}
		p := b.integral(from, from+0.25, one) / side
		if p < 0.002 {
			continue // too rare for the scatter of its batches to be normal
		}
		got, se := m.mean(func(row *[sumAll]float64) float64 {
			inside := row[sumUpper]
			if k < bins {
				inside = float64(m.blocks*blockTicks) - inside
			}
			return row[sumBins+k] - p*inside
		})
		if z := got / se; !(math.Abs(z) < 4) {
			t.Errorf("density from %g to %g σ is %.2g ± %.2g of its side off the exact %.4g: %.1f standard errors", from, from+0.25, got, se, p, z)
		}
	}
}

// S. O. Rice, Bell Syst. Tech. J. 23-24 (1944-45) (formula from memory): a
// smooth process whose velocity is independent of its position crosses x0
// p(x0)·⟨|v|⟩ times per unit time, here p(x0)·√(2/π). Of the samples of a
// Gaussian process a share of arccos(ρ(dt))/π differs in sign from the one
// before, instead of ω₀·dt/π: crossings that come in pairs within a tick are
// not seen. Near the threshold the double well's paths are as rough as that
// process, so the same part is missing, Γ·dt/6 of the whole.
func checkCrossings(t *testing.T, m *meter) {
	b := m.bench
	a := b.centre()
	rice := math.Sqrt(2/math.Pi) / (b.integral(-a-9, b.threshold, one) + b.integral(b.threshold, a+9, one)) * b.boltzmann(b.threshold)
	if b.barrier == 2 && b.threshold == 0 {
		// The same evaluated independently in double precision, to its digits.
		if !(math.Abs(rice-0.02204) < 0.5e-5) {
			t.Fatalf("Rice's rate is %g, want 0.02204", rice)
		}
	}
	seen := math.Acos(b.oscillator().Correlation(b.dt)) / b.dt
	got, se := m.of(sumEvents)
	near(t, "crossings per time", got/b.dt, se/b.dt, rice*seen, 0)
}

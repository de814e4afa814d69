package plant_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"brinkwell/controller/trace"
)

// The first state over many seeds is Boltzmann's, e^{-U/kT}, U the parabola of
// the position's side with the two made equal at the threshold. The reference
// is a quadrature of that, in σ.
func TestStartIsBoltzmann(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct {
		barrier, threshold float64
		runs               uint64
	}{
		{2, 0, 5000},
		{1, 0.2, 5000},
		{1, -0.6, 20_000}, // where the cut-off parts of the two normals matter most
		{0.05, 0.1, 5000},
		{5, 0.05, 5000},
	} {
		t.Run(fmt.Sprintf("barrier=%g/threshold=%g", c.barrier, c.threshold), func(t *testing.T) {
			t.Parallel()
			checkStart(t, c.barrier, c.threshold, uint64(i)<<32, c.runs)
		})
	}
}

func checkStart(t *testing.T, barrier, threshold float64, seed, draws uint64) {
	c := config()
	sigma := math.Sqrt(c.Oscillator.KT / c.Oscillator.Stiffness)
	thermal := math.Sqrt(c.Oscillator.KT / c.Oscillator.Mass())
	a := math.Sqrt(2 * barrier)
	c.Centres = [trace.Levels]float64{-a * sigma, a * sigma}
	c.Threshold = threshold * sigma

	boltzmann := func(x float64) float64 {
		centre := math.Copysign(a, x-threshold)
		return math.Exp(((threshold-centre)*(threshold-centre) - (x-centre)*(x-centre)) / 2)
	}
	// Each side is smooth; 9 σ beyond its centre nothing is left.
	lower := quad.Fixed(boltzmann, -a-9, threshold, 200, nil, 0)
	upper := quad.Fixed(boltzmann, threshold, a+9, 200, nil, 0)

	var sides [trace.Levels][]float64
	var velocities, products []float64
	for n := range draws {
		c.Seed = seed + n
		p := newPlant(t, c)
		var s trace.Sample
		_ = p.Sense(0, &s)
		x := s.Position / sigma
		if level := p.Level(); (x > threshold) != (level == trace.Upper) {
			t.Fatalf("seed %d starts at %g σ with the %v level", c.Seed, x, level)
		}
		sides[p.Level()] = append(sides[p.Level()], x)
		velocities = append(velocities, s.Velocity/thermal)
		products = append(products, s.Velocity/thermal*(x-threshold))
	}

	// Independent draws: binomial; 3.5 standard errors.
	runs := float64(draws)
	share := upper / (lower + upper)
	z := (float64(len(sides[trace.Upper])) - runs*share) / math.Sqrt(runs*share*(1-share))
	t.Logf("%d of %g start above, want %.1f: %.2f standard errors", len(sides[trace.Upper]), runs, runs*share, z)
	if !(math.Abs(z) < 3.5) {
		t.Errorf("%d of %g start above, want %.1f: off by %.1f standard errors", len(sides[trace.Upper]), runs, runs*share, z)
	}
	kolmogorov(t, "lower side", sides[trace.Lower], func(x float64) float64 {
		return quad.Fixed(boltzmann, -a-9, x, 100, nil, 0) / lower
	})
	kolmogorov(t, "upper side", sides[trace.Upper], func(x float64) float64 {
		return quad.Fixed(boltzmann, threshold, x, 100, nil, 0) / upper
	})
	kolmogorov(t, "velocity", velocities, distuv.UnitNormal.CDF)
	mean, std := stat.MeanStdDev(products, nil)
	if z := mean / std * math.Sqrt(runs); !(math.Abs(z) < 3.5) {
		t.Errorf("position and velocity correlate by %.1f standard errors", z)
	}
}

// kolmogorov compares independent draws with a distribution: 1.95/√n is the
// 0.1 % point of the Kolmogorov distribution.
func kolmogorov(t *testing.T, name string, x []float64, cdf func(float64) float64) {
	t.Helper()
	slices.Sort(x)
	n := float64(len(x))
	worst := 0.0
	for i, v := range x {
		c := cdf(v)
		worst = max(worst, math.Abs(c-float64(i)/n), math.Abs(c-float64(i+1)/n))
	}
	t.Logf("%s: %.2f/√n from its distribution", name, worst*math.Sqrt(n))
	if !(worst*math.Sqrt(n) < 1.95) {
		t.Errorf("%s: %.3g from its distribution, want < %.3g", name, worst, 1.95/math.Sqrt(n))
	}
}

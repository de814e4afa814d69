package effect

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"

	"brinkwell/controller/trace"
	"brinkwell/plant/motion"
)

// unit is a bench in units of sigma, 1/omega0 and kT.
func unit(barrier, threshold float64) Reference {
	return Reference{
		Rate:         20,
		Oscillator:   motion.Oscillator{Omega0: 1, Quality: 10, Stiffness: 1, KT: 1},
		HalfDistance: math.Sqrt(2 * barrier),
		Threshold:    threshold,
	}
}

func newObserver(t *testing.T, r Reference) *Observer {
	t.Helper()
	o, err := New(r)
	if err != nil {
		t.Fatal(err)
	}
	return o
}

// boltzmann fills a row with what an infinitely long run in a potential, in
// kT over sigma, would show, to the accuracy of quadrature.
func boltzmann(o *Observer, potential func(x float64) float64) []float64 {
	row := make([]float64, sumsOfTheRun+2*(momentSums+o.scale.bins))
	const ticks = 1e6
	part := row[sumsOfTheRun : sumsOfTheRun+momentSums+o.scale.bins]
	density := func(x float64) float64 { return math.Exp(-potential(x)) }
	for k := range o.scale.bins {
		from := o.ref.Threshold + float64(k-o.scale.half)/o.scale.perMetre
		to := from + 1/o.scale.perMetre
		at := func(f func(d float64) float64) float64 {
			return quad.Fixed(func(x float64) float64 { return f(x-o.ref.Threshold) * density(x) }, from, to, 8, nil, 0)
		}
		n := at(func(float64) float64 { return 1 })
		part[momentSums+k] = n
		row[sumTicks] += n
		part[momentAbs] += at(math.Abs)
		part[momentSum] += at(func(d float64) float64 { return d })
		part[momentSquare] += at(func(d float64) float64 { return d * d })
		part[momentSigned] += at(func(d float64) float64 { return d * math.Abs(d) })
	}
	scale := ticks / row[sumTicks]
	for k := range row {
		row[k] *= scale
	}
	row[sumVelocity2] = ticks
	return row
}

func doubleWell(r Reference) func(x float64) float64 {
	return func(x float64) float64 {
		if x > r.Threshold {
			u := x - r.HalfDistance
			return u*u/2 + 2*r.HalfDistance*r.Threshold
		}
		u := x + r.HalfDistance
		return u * u / 2
	}
}

// From the exact Boltzmann density of two parabolas joined at the threshold
// the estimators give back their barriers, distance, stiffness, tilt and
// temperature: tilt = 2·k·x1·x0, barriers k·(x1±x0)²/2.
func TestLandscapeOfExactDensity(t *testing.T) {
	for _, tt := range []struct{ barrier, threshold float64 }{
		{1, 0}, {2, 0}, {4, 0}, {4, 0.3}, {4, -0.3}, {8, 0.5}, {20, 0},
	} {
		r := unit(tt.barrier, tt.threshold)
		o := newObserver(t, r)
		row := boltzmann(o, doubleWell(r))
		reader := newReader(o, row, false)
		got := make([]float64, reader.quantities())
		reader.read(got, row)

		a, x0 := r.HalfDistance, r.Threshold
		upper := 1 - math.Erf(-(a-x0)/math.Sqrt2)
		lower := 1 - math.Erf(-(a+x0)/math.Sqrt2)
		odds := math.Exp(-2*a*x0) * upper / lower
		for _, c := range []struct {
			name      string
			got, want float64
			tol       float64
		}{
			// A bin's mean of a parabola's exponential is off the value at its
			// centre by (slope²-1)·w²/24: w = 0.1, slopes to 1.5 in a well, w = 0.02,
			// slopes to a+|x0| beside the threshold.
			{"barrier", got[barrier], tt.barrier, 2e-3},
			{"barrier, lower", got[barriers+int(trace.Lower)], (a + x0) * (a + x0) / 2, 2e-3},
			{"barrier, upper", got[barriers+int(trace.Upper)], (a - x0) * (a - x0) / 2, 2e-3},
			{"barrier from parabolas", got[barrierParabolas], tt.barrier, 2e-3 * tt.barrier},
			{"distance", got[distance], 2 * a, 1e-3},
			{"stiffness", got[stiffness], 1, 2e-3},
			{"tilt", got[tilt], 2 * a * x0, 1e-3},
			{"width", got[width], 1, 1e-6},
			{"kinetic", got[kinetic], 1, 1e-12},
			{"share", got[share], odds / (1 + odds), 1e-9},
		} {
			if !(math.Abs(c.got-c.want) <= c.tol) {
				t.Errorf("b = %v, x0 = %v: %s = %.6f, want %.6f within %.1g", tt.barrier, tt.threshold, c.name, c.got, c.want, c.tol)
			}
		}
	}
}

// White sensor noise of standard deviation s in a fast loop rounds the cusp:
// U = x²/2 - a·[x·erf(x/√2s) + s·√(2/π)·exp(-x²/2s²)], the barrier is lowered
// by a·s·√(2/π). (The mean force -x + a·erf(x/√2s) integrated; b = 5: 4.74769,
// 4.24306 for s = 0.1, 0.3.) The density at the threshold must show the barrier
// that is there, not that of the cusp.
func TestRoundedBarrier(t *testing.T) {
	for _, tt := range []struct{ s, want, tol float64 }{
		// The rounded top is not a parabola over 0.2 sigma; that costs most, 0.026
		// kT, where the rounding is a quarter of it, and little elsewhere.
		{0.05, 5 - math.Sqrt(10)*0.05*math.Sqrt(2/math.Pi), 0.03},
		{0.1, 4.74769, 0.02},
		{0.3, 4.24306, 0.005},
	} {
		r := unit(5, 0)
		o := newObserver(t, r)
		a := r.HalfDistance
		row := boltzmann(o, func(x float64) float64 {
			y := x / (math.Sqrt2 * tt.s)
			return x*x/2 - a*(x*math.Erf(y)+tt.s*math.Sqrt(2/math.Pi)*math.Exp(-y*y))
		})
		reader := newReader(o, row, false)
		got := make([]float64, reader.quantities())
		reader.read(got, row)
		if !(math.Abs(got[barrier]-tt.want) <= tt.tol) {
			t.Errorf("s = %v: barrier %.4f, want %.4f within %v", tt.s, got[barrier], tt.want, tt.tol)
		}
		// The wells are where they were: a parabola for |x| > 3·s.
		if !(math.Abs(got[distance]-2*a) <= 1e-3*a) {
			t.Errorf("s = %v: distance %.4f, want %.4f", tt.s, got[distance], 2*a)
		}
	}
}

// The part above zero of a normal distribution has mean and variance in
// closed form; untruncated must invert them. The half-normal's are √(2/π) and
// 1 - 2/π.
func TestUntruncated(t *testing.T) {
	for _, alpha := range []float64{0, 0.5, 1, 2, 4, 8} {
		h := distuv.UnitNormal.Prob(alpha) / distuv.UnitNormal.CDF(alpha)
		mean, variance := 3*(alpha+h), 9*(1-alpha*h-h*h)
		if alpha == 0 {
			mean, variance = 3*math.Sqrt(2/math.Pi), 9*(1-2/math.Pi)
		}
		// A flat shape hardly tells width from shift: digits are lost there.
		if got := untruncated(mean, variance); !(math.Abs(got-9) <= 9e-6) {
			t.Errorf("mean %v widths above zero: variance %v, want 9", alpha, got)
		}
	}
}

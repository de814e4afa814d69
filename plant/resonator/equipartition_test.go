package resonator_test

import (
	"fmt"
	"math"
	"testing"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// A spread is the variance of the mean of n successive samples of x², v² and
// x·v of a stationary thermal oscillator, each in units of the product of
// variances: by Isserlis' theorem ⟨x₀²xₙ²⟩ - ⟨x²⟩² = 2⟨x₀xₙ⟩², and so on.
type spread struct{ xx, vv, xv float64 }

// spreadOf sums the correlations that the damped motion gives (the regression
// of fluctuations), lag by lag until they are gone.
func spreadOf(quality, dt float64, n int) spread {
	s := spread{2, 2, 1}
	relax := 2 * max(quality, 1/quality) // at least the slowest time constant
	for lag := 1; float64(lag)*dt < 20*relax && lag < n; lag++ {
		t := dt * float64(lag)
		xx, vx := damped(quality, 1, 0, t) // ⟨x₀xₙ⟩, ⟨x₀vₙ⟩
		xv, vv := damped(quality, 0, 1, t) // ⟨v₀xₙ⟩, ⟨v₀vₙ⟩
		w := 2 * (1 - float64(lag)/float64(n))
		s.xx += w * 2 * xx * xx
		s.vv += w * 2 * vv * vv
		s.xv += w * (xx*vv + xv*vx)
	}
	return spread{s.xx / float64(n), s.vv / float64(n), s.xv / float64(n)}
}

// With ticks short against everything the variance of the mean is
// 2·var·τ/T, with the integrated autocorrelation times
//
//	τ(x²) = (ω₀² + Γ²)/(2·Γ·ω₀²),  τ(v²) = 1/(2·Γ)
//
// (integrals of the squares of the correlation functions of M. C. Wang and
// G. E. Uhlenbeck, Rev. Mod. Phys. 17, 323 (1945), done for this test): so
// the errors that the test below goes by are themselves tested.
func TestSpreadIsThatOfIntegratedTimes(t *testing.T) {
	for _, quality := range []float64{0.1, 0.5, 10} {
		g := 1 / quality
		const n = 1 << 24
		dt := 0.005 * min(quality, 1)
		got := spreadOf(quality, dt, n)
		total := n * dt
		// The sum differs from the integral by (dt·rate)² ~ 1e-4 and by the
		// memory over the length of the record, some 1e-3.
		for _, c := range []struct {
			name      string
			got, want float64
		}{
			{"x²", got.xx, 2 * 2 * (1 + g*g) / (2 * g) / total},
			{"v²", got.vv, 2 * 2 / (2 * g) / total},
		} {
			if !(math.Abs(c.got/c.want-1) < 3e-3) {
				t.Errorf("Q = %g: variance of the mean of %s %.4g, want %.4g within 0.3 %%", quality, c.name, c.got, c.want)
			}
		}
	}
}

// Equipartition: ⟨x²⟩ = kT/k, ⟨v²⟩ = kT/m, ⟨xv⟩ = 0, at ticks short and long
// against the motion. Mean values beyond 3.5 standard errors would come once
// in 80 such tables.
func TestEquipartition(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct{ quality, dt float64 }{
		{0.02, 0.01},
		{0.02, 1},
		{0.5, 0.05},
		{0.5, 1},
		{10, 0.05},
		{10, 1},
		{1000, 0.05},
		{1000, 1.5},
	} {
		t.Run(fmt.Sprintf("Q=%g/dt=%g", c.quality, c.dt), func(t *testing.T) {
			t.Parallel()
			const n = 15e6
			o := paddle(c.quality)
			xx, vv, xv := meanSquares(t, o, c.dt, n, uint64(i))
			s := spreadOf(c.quality, c.dt, n)
			for _, m := range []struct {
				name               string
				got, want, squared float64
			}{
				{"<x²>/(kT/k)", xx, 1, s.xx},
				{"<v²>/(kT/m)", vv, 1, s.vv},
				{"<xv>", xv, 0, s.xv},
			} {
				z := (m.got - m.want) / math.Sqrt(m.squared)
				t.Logf("%s = %.5f ± %.5f", m.name, m.got, math.Sqrt(m.squared))
				if !(math.Abs(z) < 3.5) {
					t.Errorf("%s = %.5f, want %g: off by %.2f standard errors of %.2g", m.name, m.got, m.want, z, math.Sqrt(m.squared))
				}
			}
		})
	}
}

// meanSquares runs from a state drawn from equilibrium, in thermal units.
func meanSquares(t *testing.T, o motion.Oscillator, dt float64, n int, seed uint64) (xx, vv, xv float64) {
	length, speed, time := units(o)
	r := newResonator(t, o, dt*time)
	bath := resonator.NewBath(o, dt*time, variate.NewNormal(seed, 0))
	start := variate.NewNormal(seed, 1)
	// A centre off 0: the position is counted from it.
	r.Set(length*(3+start.Next()), speed*start.Next(), 3*length)
	for range n {
		x, v := r.Position()-3*length, r.Velocity()
		xx += x * x
		vv += v * v
		xv += x * v
		r.Step(bath.Next())
	}
	return xx / length / length / float64(n), vv / speed / speed / float64(n), xv / length / speed / float64(n)
}

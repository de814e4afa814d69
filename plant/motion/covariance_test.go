package motion_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"brinkwell/plant/motion"
)

// C for m = k = k_B·T = 1, dt = 0.05; source as for propagatorTable.
var noiseTable = []struct{ quality, xx, xv, vv, det float64 }{
	{0.2, 3.46729184046611e-04, 9.77767505980156e-03, 3.93163329374136e-01, 4.07182708158776e-05},
	{0.5, 1.54653070264672e-04, 4.52418709017980e-03, 1.81122136677457e-01, 7.54282570311661e-06},
	{10, 8.29800775993794e-06, 2.48546412508123e-04, 9.94188896562462e-03, 2.07225526145363e-08},
	{1000, 8.32885533944742e-08, 2.49779246876187e-06, 9.99117136958029e-05, 2.08253488388277e-12},
}

func TestNoiseTable(t *testing.T) {
	// Half a unit in the fifteenth digit, at most 3.3e-15 of these numbers, and
	// some roundings; the determinant quadruples those.
	const tol, detTol = 5e-15, 1e-14
	for _, row := range noiseTable {
		c := unit(row.quality).Noise(0.05)
		if !within(c.XX, row.xx, tol) || !within(c.XV, row.xv, tol) || !within(c.VV, row.vv, tol) {
			t.Errorf("Q = %g: Noise(0.05) = %+v, want %+v", row.quality, c, row)
		}
		if det := c.XX*c.VV - c.XV*c.XV; !within(det, row.det, detTol) {
			t.Errorf("Q = %g: det = %v, want %v", row.quality, det, row.det)
		}
	}
}

func TestNoiseAgainstVanLoan(t *testing.T) {
	grid(func(quality, turn float64) {
		o := bench(quality)
		dt := turn / o.Omega0
		_, want := exact(quality, o.Omega0*dt)
		variance := o.KT / o.Stiffness
		c := o.Noise(dt)

		// A dozen roundings; some are doubled by the closed forms.
		const tol = 3e-15
		if d := deviation(c.XX/variance, want[0][0], want[0][0]); !(d <= tol) {
			t.Errorf("Q = %g, turn %g: XX off by %.1e", quality, turn, d)
		}
		if d := deviation(c.VV/variance/o.Omega0/o.Omega0, want[1][1], want[1][1]); !(d <= tol) {
			t.Errorf("Q = %g, turn %g: VV off by %.1e", quality, turn, d)
		}
		// XV returns to zero each half period: there the scale is √(XX·VV), and
		// the phase's rounding counts.
		scale := number(0)
		scale.Mul(want[0][0], want[1][1]).Sqrt(scale)
		if turn < 1 {
			scale = want[0][1]
		}
		if d := deviation(c.XV/variance/o.Omega0, want[0][1], scale); !(d <= tol+1e-15*turn) {
			t.Errorf("Q = %g, turn %g: XV off by %.1e", quality, turn, d)
		}
	})
}

func TestCholeskyAgainstVanLoan(t *testing.T) {
	grid(func(quality, turn float64) {
		o := bench(quality)
		dt := turn / o.Omega0
		_, want := exact(quality, o.Omega0*dt)
		l11, l21, l22 := o.Noise(dt).Cholesky()
		if !(l11 > 0 && l22 > 0) {
			t.Errorf("Q = %g, turn %g: l11 = %g, l22 = %g, want both positive", quality, turn, l11, l22)
		}

		sigma := math.Sqrt(o.KT / o.Stiffness)
		root, last := number(0), number(0)
		root.Sqrt(want[0][0])
		last.Quo(want.determinant(), want[0][0])
		last.Sqrt(last)
		vv := number(0).Sqrt(want[1][1])
		// XX and VV are good to 3e-15; l22² is the difference of VV and, for
		// short steps, 3/4 of it, which quadruples that; the root halves it.
		if d := deviation(l11/sigma, root, root); !(d <= 2e-15) {
			t.Errorf("Q = %g, turn %g: l11 off by %.1e", quality, turn, d)
		}
		if d := deviation(l22/sigma/o.Omega0, last, last); !(d <= 1e-14) {
			t.Errorf("Q = %g, turn %g: l22 off by %.1e", quality, turn, d)
		}
		if d := deviation(l21/sigma/o.Omega0, number(0).Quo(want[0][1], root), vv); !(d <= 3e-15+1e-15*turn) {
			t.Errorf("Q = %g, turn %g: l21 off by %.1e", quality, turn, d)
		}
	})
}

func TestNoiseAgainstMatrixExponential(t *testing.T) {
	for _, quality := range []float64{0.2, 0.5, 0.7, 10} {
		for _, turn := range []float64{0.05, 0.5, 2, 4} {
			g := turn / quality
			var e mat.Dense
			e.Exp(mat.NewDense(4, 4, []float64{
				0, turn, 0, 0,
				-turn, -g, 0, 2 * g,
				0, 0, 0, turn,
				0, 0, -turn, g,
			}))
			var c mat.Dense
			c.Mul(e.Slice(0, 2, 2, 4), e.Slice(0, 2, 0, 2).T())
			got := unit(quality).Noise(turn)
			// The block holds Φ⁻ᵀ, of norm up to e^20 here, and its product with Φ
			// loses as much of gonum's 1e-15.
			tol := 1e-14 * max(1, math.Exp(g)) * max(c.At(0, 0), c.At(1, 1))
			for _, entry := range []struct{ got, want float64 }{
				{got.XX, c.At(0, 0)},
				{got.XV, c.At(0, 1)},
				{got.XV, c.At(1, 0)},
				{got.VV, c.At(1, 1)},
			} {
				if !(math.Abs(entry.got-entry.want) <= tol) {
					t.Errorf("Q = %g, turn %g: Noise %v, mat.Exp %v within %.0e", quality, turn, entry.got, entry.want, tol)
				}
			}
		}
	}
}

func TestNoiseOfTwoStepsAdds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		o, dt := anyMotion(t)
		p, c, twice := o.Propagate(dt), o.Noise(dt), o.Noise(2*dt)
		check := func(name string, got float64, terms ...float64) {
			var sum, size float64
			for _, x := range terms {
				sum += x
				size += math.Abs(x)
			}
			// The terms carry 3e-15 and the rounding of the phase.
			tol := 5e-15 * (1 + dt) * size
			if !(math.Abs(got-sum) <= tol) {
				t.Errorf("%s(2dt) = %v, Φ·C·Φᵀ + C gives %v", name, got, sum)
			}
		}
		check("XX", twice.XX, c.XX, p.XX*p.XX*c.XX, 2*p.XX*p.XV*c.XV, p.XV*p.XV*c.VV)
		check("XV", twice.XV, c.XV, p.XX*p.VX*c.XX, (p.XX*p.VV+p.XV*p.VX)*c.XV, p.XV*p.VV*c.VV)
		check("VV", twice.VV, c.VV, p.VX*p.VX*c.XX, 2*p.VX*p.VV*c.XV, p.VV*p.VV*c.VV)
		if _, _, l22 := twice.Cholesky(); !(l22 > 0) {
			t.Errorf("l22 = %g, want positive", l22)
		}
	})
}

func TestNoiseOfShortSteps(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.5, 35, 1e6} {
		o := bench(quality)
		g := o.Damping()
		dt := 1e-9 / max(o.Omega0, g)
		diffusion := g * o.KT / o.Mass() // ⟨v²⟩ grows at twice this
		c := o.Noise(dt)
		// The leading orders of the integrals; the next is smaller by about
		// max(Γ, ω₀)·dt = 1e-9.
		const tol = 2e-9
		if want := diffusion * dt * dt * dt * 2 / 3; !within(c.XX, want, tol) {
			t.Errorf("Q = %g: XX = %v, want %v", quality, c.XX, want)
		}
		if want := diffusion * dt * dt; !within(c.XV, want, tol) {
			t.Errorf("Q = %g: XV = %v, want %v", quality, c.XV, want)
		}
		if want := diffusion * dt * 2; !within(c.VV, want, tol) {
			t.Errorf("Q = %g: VV = %v, want %v", quality, c.VV, want)
		}
	}
}

func TestNoiseOfLongStepsIsEquipartition(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.02, 0.5, 3, 1e3, 1e6} {
		o := bench(quality)
		c := o.Noise(1e3 * max(quality, 1/quality) / o.Omega0) // e^-500 is left at most
		if want := o.KT / o.Stiffness; !within(c.XX, want, 1e-15) {
			t.Errorf("Q = %g: XX = %v, want kT/k = %v", quality, c.XX, want)
		}
		if want := o.KT / o.Mass(); !within(c.VV, want, 1e-15) {
			t.Errorf("Q = %g: VV = %v, want kT/m = %v", quality, c.VV, want)
		}
		if !(math.Abs(c.XV) <= 1e-200) {
			t.Errorf("Q = %g: XV = %v, want 0", quality, c.XV)
		}
	}
}

func TestCholeskyOfSpecialMatrices(t *testing.T) {
	if a, b, c := (motion.Covariance{}).Cholesky(); a != 0 || b != 0 || c != 0 {
		t.Errorf("of zero: %g, %g, %g, want zeros", a, b, c)
	}
	if a, b, c := (motion.Covariance{VV: 4}).Cholesky(); a != 0 || b != 0 || c != 2 {
		t.Errorf("of VV = 4: %g, %g, %g, want 0, 0, 2", a, b, c)
	}
	if a, b, c := (motion.Covariance{XX: 4, XV: 6, VV: 25}).Cholesky(); a != 2 || b != 3 || c != 4 {
		t.Errorf("of [4 6; 6 25]: %g, %g, %g, want 2, 3, 4", a, b, c)
	}
	for _, c := range []motion.Covariance{
		{XX: 1, XV: 2, VV: 1},
		{XX: -1, VV: 1},
		{XX: 1, VV: -1},
		{XV: 1, VV: 1},
		{VV: -1},
		{XX: math.NaN(), VV: 1},
		{XX: 1, XV: math.NaN(), VV: 1},
		{XX: 1, VV: math.NaN()},
	} {
		mustPanic(t, "an indefinite matrix", func() { c.Cholesky() })
	}
}

func BenchmarkNoise(b *testing.B) {
	for _, bb := range []struct {
		name string
		turn float64
	}{{"short", 0.04}, {"long", 40}} {
		b.Run("step="+bb.name, func(b *testing.B) {
			o := unit(35)
			for b.Loop() {
				o.Noise(bb.turn)
			}
		})
	}
}

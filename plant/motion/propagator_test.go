package motion_test

import (
	"math"
	"math/big"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"brinkwell/plant/motion"
)

// Φ for m = k = k_B·T = 1, dt = 0.05: 40-digit mpmath evaluation of the
// formulas of Nørrelykke and Flyvbjerg, Phys. Rev. E 83, 041103 (2011)
// (formulas from memory), cross-checked there with scipy.linalg.expm.
var propagatorTable = []struct{ quality, xx, xv, vv float64 }{
	{0.2, 0.998848204585658, 0.0442214315910319, 0.777741046630499},
	{0.5, 0.998790895725750, 0.0475614712250357, 0.903667953275678},
	{10, 0.998752340606598, 0.0498544293426495, 0.993766897672333},
	{1000, 0.998750281222831, 0.0499779198122718, 0.998700303303019},
}

func TestPropagateTable(t *testing.T) {
	// Half a unit in the fifteenth digit, at most 1.2e-15 of these numbers, and
	// two roundings.
	const tol = 1.5e-15
	for _, row := range propagatorTable {
		p := unit(row.quality).Propagate(0.05)
		if !within(p.XX, row.xx, tol) || !within(p.XV, row.xv, tol) || !within(p.VX, -row.xv, tol) || !within(p.VV, row.vv, tol) {
			t.Errorf("Q = %g: Propagate(0.05) = %+v, want %+v", row.quality, p, row)
		}
	}
}

func TestPropagateAgainstVanLoan(t *testing.T) {
	grid(func(quality, turn float64) {
		o := bench(quality)
		dt := turn / o.Omega0
		want, _ := exact(quality, o.Omega0*dt)
		p := o.Propagate(dt)

		// As documented: the phase and the decay are products rounded to
		// 1e-16 of themselves, and a few more roundings follow. VV changes sign
		// at any damping, the others only while they oscillate.
		tol := 1e-15 * (1 + turn)
		largest := want[0][0]
		for _, entry := range []*big.Float{want[0][1], want[1][1]} {
			if number(0).Abs(entry).Cmp(number(0).Abs(largest)) > 0 {
				largest = entry
			}
		}
		for _, entry := range []struct {
			name       string
			got        float64
			want       *big.Float
			oscillates bool
		}{
			{"XX", p.XX, want[0][0], turn > 1 && quality > 0.5},
			{"XV", p.XV * o.Omega0, want[0][1], turn > 1 && quality > 0.5},
			{"VX", p.VX / o.Omega0, want[1][0], turn > 1 && quality > 0.5},
			{"VV", p.VV, want[1][1], true},
		} {
			scale := entry.want
			if entry.oscillates {
				scale = largest
			}
			if d := deviation(entry.got, entry.want, scale); !(d <= tol) {
				t.Errorf("Q = %g, turn %g: %s off by %.1e", quality, turn, entry.name, d)
			}
		}
	})
}

func TestPropagateAgainstMatrixExponential(t *testing.T) {
	for _, quality := range []float64{0.1, 0.5, 0.7, 35, 1e6} {
		for _, turn := range []float64{1e-6, 0.05, 1, 5} {
			var e mat.Dense
			e.Exp(mat.NewDense(2, 2, []float64{0, turn, -turn, -turn / quality}))
			p := unit(quality).Propagate(turn)
			// gonum's Padé form and scaling cost a rounding for each of the up
			// to a dozen products, of matrices of norm up to 50.
			const tol = 5e-15
			for _, entry := range []struct{ got, want float64 }{
				{p.XX, e.At(0, 0)},
				{p.XV, e.At(0, 1)},
				{p.VX, e.At(1, 0)},
				{p.VV, e.At(1, 1)},
			} {
				if !(math.Abs(entry.got-entry.want) <= tol) {
					t.Errorf("Q = %g, turn %g: Propagate %v, mat.Exp %v", quality, turn, entry.got, entry.want)
				}
			}
		}
	}
}

func TestStepResponseAgainstVanLoan(t *testing.T) {
	grid(func(quality, turn float64) {
		o := bench(quality)
		dt := turn / o.Omega0
		phi, _ := exact(quality, o.Omega0*dt)
		want := number(1)
		want.Sub(want, phi[0][0])

		dx, dv := o.StepResponse(dt)
		// A few roundings, and that of the phase, which a narrow resonance
		// magnifies just before and after whole periods.
		response, _ := want.Float64()
		tol := 2e-15 + 2e-16*turn*math.Abs(dv/o.Omega0)/response
		if d := deviation(dx, want, want); !(d <= tol) {
			t.Errorf("Q = %g, turn %g: dx off by %.1e, allowed %.1e", quality, turn, d, tol)
		}
		if p := o.Propagate(dt); dv != -p.VX {
			t.Errorf("Q = %g, turn %g: dv = %v, want -VX = %v", quality, turn, dv, -p.VX)
		}
	})
}

func TestTwoStepsAreOneOfTwiceTheLength(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		o, dt := anyMotion(t)
		p, twice := o.Propagate(dt), o.Propagate(2*dt)
		largest := max(math.Abs(p.XX), math.Abs(p.XV), math.Abs(p.VV))
		check := func(name string, got, a, b float64) {
			// Φ(dt) carries 1e-15·(1 + dt) of its largest entry, Φ(2dt) twice that.
			tol := 5e-15 * (1 + dt) * max(math.Abs(a), math.Abs(b), min(1, dt)*largest*largest)
			if !(math.Abs(got-(a+b)) <= tol) {
				t.Errorf("%s(2dt) = %v, Φ(dt)² gives %v", name, got, a+b)
			}
		}
		check("XX", twice.XX, p.XX*p.XX, p.XV*p.VX)
		check("XV", twice.XV, p.XX*p.XV, p.XV*p.VV)
		check("VX", twice.VX, p.VX*p.XX, p.VV*p.VX)
		check("VV", twice.VV, p.VX*p.XV, p.VV*p.VV)
	})
}

func TestNoStepDoesNothing(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.5, 1e6} {
		o := bench(quality)
		if p := o.Propagate(0); p != (motion.Propagator{XX: 1, VV: 1}) {
			t.Errorf("Q = %g: Propagate(0) = %+v, want the identity", quality, p)
		}
		if c := o.Noise(0); c != (motion.Covariance{}) {
			t.Errorf("Q = %g: Noise(0) = %+v, want zero", quality, c)
		}
		if dx, dv := o.StepResponse(0); dx != 0 || dv != 0 {
			t.Errorf("Q = %g: StepResponse(0) = %g, %g, want zero", quality, dx, dv)
		}
	}
}

func TestLongStepForgets(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.02, 0.5, 3, 1e3, 1e6} {
		o := bench(quality)
		dt := 1e3 * max(quality, 1/quality) / o.Omega0 // e^-500 is left at most
		if p := o.Propagate(dt); !(math.Abs(p.XX) < 1e-200 && math.Abs(p.VV) < 1e-200) {
			t.Errorf("Q = %g: Propagate(%g) = %+v, want zero", quality, dt, p)
		}
		if dx, _ := o.StepResponse(dt); dx != 1 {
			t.Errorf("Q = %g: StepResponse(%g) = %v, want 1", quality, dt, dx)
		}
	}
}

func TestCorrelation(t *testing.T) {
	o := bench(10)
	for _, lag := range []float64{0, 1e-5, 1e-3} {
		// The regression of a linear process: the mean decays as fluctuations do.
		want := o.Propagate(lag).XX
		if got := o.Correlation(lag); got != want {
			t.Errorf("Correlation(%g) = %v, want %v", lag, got, want)
		}
		if got := o.Correlation(-lag); got != want {
			t.Errorf("Correlation(%g) = %v, want %v", -lag, got, want)
		}
	}
}

package resonator_test

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/stat/distuv"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// meanPeriodogram averages the one-sided periodograms (every bin doubled, m²/Hz)
// of independent records, each started from equilibrium.
func meanPeriodogram(t *testing.T, o motion.Oscillator, dt float64, n, records int, seed uint64) []float64 {
	length, speed, _ := units(o)
	r := newResonator(t, o, dt)
	bath := resonator.NewBath(o, dt, variate.NewNormal(seed, 0))
	start := variate.NewNormal(seed, 1)
	fft := fourier.NewFFT(n)
	x, mean := make([]float64, n), make([]float64, n/2+1)
	var bins []complex128
	for range records {
		r.Set(length*start.Next(), speed*start.Next(), 0)
		for i := range x {
			x[i] = r.Position()
			r.Step(bath.Next())
		}
		bins = fft.Coefficients(bins, x)
		for k, b := range bins {
			mean[k] += (real(b)*real(b) + imag(b)*imag(b)) * 2 * dt / float64(n) / float64(records)
		}
	}
	return mean
}

// binCovariance returns the exact covariance of the bins of one record's
// periodogram: with A = ⟨X_j·conj X_k⟩ and B = ⟨X_j·X_k⟩ of the Gaussian bins
// it is |A|² + |B|² (Isserlis' theorem), in units of m⁴/Hz².
func binCovariance(o motion.Oscillator, dt float64, n int) [][]float64 {
	bins := n/2 + 1
	fft := fourier.NewCmplxFFT(n)
	// ⟨x_a·X_k⟩ for every a, then the transform over a.
	rows := make([][]complex128, n)
	for a := range rows {
		rows[a] = make([]complex128, n)
		for b := range n {
			rows[a][b] = complex(o.KT/o.Stiffness*o.Correlation(float64(a-b)*dt), 0)
		}
		rows[a] = fft.Coefficients(nil, rows[a])
	}
	cov := make([][]float64, bins)
	for j := range cov {
		cov[j] = make([]float64, bins)
	}
	column := make([]complex128, n)
	for k := range bins {
		for a := range column {
			column[a] = rows[a][k]
		}
		both := fft.Coefficients(nil, column) // ⟨X_j·X_k⟩, X_{n-j} = conj X_j
		for j := range bins {
			same, mirrored := cmplx.Abs(both[j]), cmplx.Abs(both[(n-j)%n])
			scale := 2 * dt / float64(n)
			cov[j][k] = (same*same + mirrored*mirrored) * scale * scale
		}
	}
	return cov
}

// The averaged periodogram of the simulated position, bin by bin, against the
// exact mean of S. F. Nørrelykke and H. Flyvbjerg, Phys. Rev. E 83, 041103
// (2011), leakage of the short record included. The deviations z of the bins
// are correlated by leakage, with known ρ; Σz² of K bins then goes as χ² of
// K²/Σρ² degrees of freedom (F. E. Satterthwaite, Biometrics 2, 110 (1946),
// from memory). It is asked to lie within the middle 99.9 %.
func TestPeriodogram(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct{ quality, dt float64 }{
		{0.5, 0.05},
		{0.5, 1},
		{10, 0.05}, // the record is two thirds of the memory
		{10, 1.5},
		{1000, 1.5}, // a fifth
	} {
		t.Run(fmt.Sprintf("Q=%g/dt=%g", c.quality, c.dt), func(t *testing.T) {
			t.Parallel()
			const n, records = 256, 2000
			o := paddle(c.quality)
			_, _, time := units(o)
			dt := c.dt * time
			got := meanPeriodogram(t, o, dt, n, records, uint64(100+i))
			cov := binCovariance(o, dt, n)
			var chi2, rho2, worst float64
			for k := range got {
				z := (got[k] - o.MeanPeriodogram(k, n, dt)) / math.Sqrt(cov[k][k]/records)
				chi2 += z * z
				worst = max(worst, math.Abs(z))
				for j := range got {
					rho := cov[j][k] / math.Sqrt(cov[j][j]*cov[k][k])
					rho2 += rho * rho
				}
			}
			checkChi2(t, chi2, len(got), float64(len(got)*len(got))/rho2)
			// 129 bins beyond 4.2 standard errors: one table in 300.
			if !(worst < 4.2) {
				t.Errorf("a bin is off by %.1f standard errors", worst)
			}
		})
	}
}

// A record of many memories shows the sampled spectrum itself: the bins are
// independent, and what leaks is a fraction of an error.
func TestSampledSpectrum(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct{ quality, dt float64 }{{0.5, 0.5}, {10, 1.5}} {
		t.Run(fmt.Sprintf("Q=%g/dt=%g", c.quality, c.dt), func(t *testing.T) {
			t.Parallel()
			const n, records = 8192, 128
			o := paddle(c.quality)
			_, _, time := units(o)
			dt := c.dt * time
			got := meanPeriodogram(t, o, dt, n, records, uint64(200+i))
			var chi2 float64
			for k := range got {
				want := o.SampledSpectrum(float64(k)/(n*dt), dt)
				if leak := o.MeanPeriodogram(k, n, dt)/want - 1; !(math.Abs(leak) < 0.2/math.Sqrt(records)) {
					t.Fatalf("bin %d: the record leaks %.2g, too much for the comparison", k, leak)
				}
				variance := 1.0 / records // of an exponential variate's mean
				if k == 0 || k == n/2 {
					variance *= 2 // real bins
				}
				z := (got[k]/want - 1) / math.Sqrt(variance)
				chi2 += z * z
			}
			// A mean of exponential variates has an excess kurtosis of 6/records,
			// by which χ² scatters a little more: fewer degrees of freedom.
			checkChi2(t, chi2, len(got), float64(len(got))/(1+3.0/records))
		})
	}
}

func checkChi2(t *testing.T, chi2 float64, bins int, freedom float64) {
	t.Helper()
	p := distuv.ChiSquared{K: freedom}.CDF(chi2 / float64(bins) * freedom)
	t.Logf("χ² = %.1f of %d bins, %.1f degrees of freedom: level %.4f", chi2, bins, freedom, p)
	if !(p > 0.0005 && p < 0.9995) {
		t.Errorf("χ² = %.1f of %d bins lies at %.5f of its distribution of %.1f degrees of freedom", chi2, bins, p, freedom)
	}
}

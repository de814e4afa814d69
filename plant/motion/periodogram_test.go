package motion_test

import (
	"math"
	"math/big"
	"testing"
)

func TestMeanPeriodogramTable(t *testing.T) {
	// Two-sided, for m = k = k_B·T = 1, Q = 10, dt = 0.05, 256 samples: 40-digit
	// mpmath evaluation of the sum in the doc comment, which is the definition.
	for _, row := range []struct {
		k    int
		want float64
	}{
		{0, 0.27239866244},
		{1, 0.49518182832},
		{2, 5.2749901341},
		{3, 0.32148343880},
		{10, 3.9251836448e-3},
		{128, 4.6876805661e-5},
	} {
		// Half a unit in the last of 11 digits.
		if got := unit(10).MeanPeriodogram(row.k, 256, 0.05); !within(got, 2*row.want, 2e-11) {
			t.Errorf("MeanPeriodogram(%d, 256) = %v, want %v", row.k, got, 2*row.want)
		}
	}
}

func TestMeanPeriodogramIsTheWeightedSum(t *testing.T) {
	for _, quality := range []float64{1e-3, 0.1, 0.5 - 1e-12, 0.5, 0.5 + 1e-12, 3, 10, 1e3, 1e6} {
		for _, turn := range []float64{1e-4, 0.01, 0.3, 1, 3} {
			for _, n := range []int{1, 2, 16, 256} {
				o := unit(quality)
				sums := weightedSums(quality, turn, n)
				for _, k := range []int{0, n / 16, n / 8, n / 4, n / 2} {
					// A few roundings, those of the phases, and those of the phase over
					// the record. Where the record is short against the memory or the
					// beat with the peak, the two parts exceed their sum by the ratio.
					theta := 2 * math.Pi * float64(k) / float64(n)
					excess := 1 / (float64(n) * fromPeak(quality, turn, theta))
					tol := (6e-15+phaseError(quality, turn, theta))*(1+excess) + 1e-16*float64(n)*turn
					if d := deviation(o.MeanPeriodogram(k, n, turn)/(2*turn), sums[k], sums[k]); !(d <= tol) {
						t.Errorf("Q = %g, turn %g, n = %d: MeanPeriodogram(%d) off by %.1e, allowed %.1e", quality, turn, n, k, d, tol)
					}
				}
			}
		}
	}
}

// weightedSums returns Σ (1 - |j|/n)·ρ(j·t)·cos(2πjk/n), |j| < n, for k from 0 to
// n/2, with ρ = (Φʲ)_xx from the reference Φ. n must be a power of two.
func weightedSums(quality, t float64, n int) []*big.Float {
	phi, _ := exact(quality, t)
	power := square(2)
	power[0][0].SetInt64(1)
	power[1][1].SetInt64(1)
	weighted := make([]*big.Float, n)
	for j := range weighted {
		weighted[j] = number(2 * float64(n-j) / float64(n)) // exact, as n is a power of two
		weighted[j].Mul(weighted[j], power[0][0])
		power = power.times(phi)
	}

	cosines := circle(n)
	sums := make([]*big.Float, n/2+1)
	for k := range sums {
		sums[k] = number(1)
		for j := 1; j < n; j++ {
			term := number(0)
			sums[k].Add(sums[k], term.Mul(weighted[j], cosines[j*k%n]))
		}
	}
	return sums
}

// circle returns cos 2πj/n for all j, from halved angles.
func circle(n int) []*big.Float {
	turn := square(2) // rotation by 2π/m
	turn[0][0].SetInt64(1)
	turn[1][1].SetInt64(1)
	for m := 2; m <= n; m *= 2 {
		switch m {
		case 2:
			turn[0][0].SetInt64(-1)
			turn[1][1].SetInt64(-1)
		case 4:
			turn = square(2)
			turn[0][1].SetInt64(-1)
			turn[1][0].SetInt64(1)
		default:
			cos, sin := number(1), number(1)
			cos.Add(cos, turn[0][0]).Quo(cos, number(2)).Sqrt(cos)
			sin.Sub(sin, turn[0][0]).Quo(sin, number(2)).Sqrt(sin)
			turn = square(2)
			turn[0][0].Set(cos)
			turn[1][1].Set(cos)
			turn[0][1].Neg(sin)
			turn[1][0].Set(sin)
		}
	}
	cosines := make([]*big.Float, n)
	at := square(2)
	at[0][0].SetInt64(1)
	at[1][1].SetInt64(1)
	for j := range cosines {
		cosines[j] = at[0][0]
		at = at.times(turn)
	}
	return cosines
}

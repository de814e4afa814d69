package estimate

import (
	"math"

	"gonum.org/v1/gonum/stat"
)

// A Blocking is what one level of blocking says of the error of a mean.
type Blocking struct {
	Blocks        int     // how many blocks
	StandardError float64 // of the mean, as if the blocks were independent
	Uncertainty   float64 // standard error of StandardError
	Neighbours    float64 // correlation of neighbouring blocks
}

// Block returns the levels of blocking of a series: the series itself, the
// means of its neighbours two by two, and so on down to two blocks. A last
// block without a partner is left out. See H. Flyvbjerg and H.G. Petersen,
// J. Chem. Phys. 91, 461 (1989).
func Block(series []float64) []Blocking {
	var levels []Blocking
	x := append([]float64(nil), series...)
	for len(x) >= 2 {
		n := float64(len(x))
		mean := stat.Mean(x, nil)
		var c0, c1 float64
		for i, v := range x {
			c0 += (v - mean) * (v - mean)
			if i > 0 {
				c1 += (v - mean) * (x[i-1] - mean)
			}
		}
		se := math.Sqrt(c0 / n / (n - 1))
		b := Blocking{Blocks: len(x), StandardError: se, Uncertainty: se / math.Sqrt(2*(n-1))}
		if c0 > 0 {
			b.Neighbours = c1 / c0
		}
		levels = append(levels, b)
		half := len(x) / 2
		for i := range half {
			x[i] = (x[2*i] + x[2*i+1]) / 2
		}
		x = x[:half]
	}
	return levels
}

const (
	fewestBlocks = 16  // a standard error from fewer is itself 18 % uncertain
	correlated   = 0.2 // neighbours' correlation that blocking should bring down
)

// Mean returns the mean of a stationary series with its interval.
//
// The level of blocking is the finest whose neighbours correlate by less than
// 0.2; what correlation κ is left enters as err² = (var/n)·(1 + 2·Σ κ_d) with
// κ_d = κ^d. Estimating κ costs degrees of freedom: the relative variance of
// err² is then about 6/n in place of 2/n.
//
// There is no interval where fewer than 16 blocks are left.
func Mean(series []float64) Value {
	levels := Block(series)
	for _, b := range levels {
		if b.Blocks < fewestBlocks {
			break
		}
		n := float64(b.Blocks)
		if b.Neighbours > correlated+1/math.Sqrt(n) {
			continue
		}
		kappa := b.Neighbours + 1/n                  // the estimate from n values is low by 1/n
		factor := math.Max((1+kappa)/(1-kappa), 0.1) // a stronger anticorrelation is noise
		return normal(stat.Mean(series, nil), b.StandardError*math.Sqrt(factor), n/3)
	}
	if len(series) < fewestBlocks {
		return tooFew(len(series))
	}
	quarter := len(series) / 4
	return Unknown("the run is too short for it, or not stationary: its quarters give %.3g, %.3g, %.3g and %.3g",
		stat.Mean(series[:quarter], nil), stat.Mean(series[quarter:2*quarter], nil),
		stat.Mean(series[2*quarter:3*quarter], nil), stat.Mean(series[3*quarter:], nil))
}

func tooFew(stretches int) Value {
	return Unknown("the run is too short for an interval: %d of the %d stretches that it takes", stretches, fewestBlocks)
}

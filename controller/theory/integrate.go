package theory

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// panels integrates f from lo to hi in panels no wider than width, each by
// 20-point Gauss-Legendre.
func panels(f func(float64) float64, lo, hi, width float64) float64 {
	n := int(math.Ceil((hi - lo) / width))
	var s float64
	for i := range n {
		p := lo + (hi-lo)*float64(i)/float64(n)
		q := lo + (hi-lo)*float64(i+1)/float64(n)
		s += quad.Fixed(f, p, q, 20, quad.Legendre{}, 0)
	}
	return s
}

// firstRoot returns the root of f between lo and hi > lo > 0, where f falls
// from positive to negative, to double precision relative to the root.
func firstRoot(f func(float64) float64, lo, hi float64) float64 {
	for range 200 {
		m := math.Sqrt(lo * hi)
		if hi > 4*lo {
			if f(m) > 0 {
				lo = m
			} else {
				hi = m
			}
			continue
		}
		m = lo + (hi-lo)/2
		if m == lo || m == hi {
			break
		}
		if f(m) > 0 {
			lo = m
		} else {
			hi = m
		}
	}
	return lo + (hi-lo)/2
}

// kummer is M(p, q, z) by its series, for z ≥ 0; the terms past the first
// few have one sign for -1 ≤ p ≤ 0, so that nothing cancels.
func kummer(p, q, z float64) float64 {
	term, s := 1.0, 1.0
	for n := 0.0; n < 5000; n++ {
		term *= (p + n) / (q + n) * z / (n + 1)
		s += term
		if n > z && math.Abs(term) <= 1e-17*math.Abs(s) {
			break
		}
	}
	return s
}

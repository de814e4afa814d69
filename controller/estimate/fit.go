package estimate

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// A LogParabola is the curve ln(λ) = c₀ + c₁·u + c₂·u² of the expected count λ
// of a histogram bin at u.
type LogParabola [3]float64

// FitLogParabola fits a parabola to the logarithm of a histogram, counts[i]
// at u[i], by maximum likelihood for Poisson counts: Newton's method on the
// log-linear model (P. McCullagh and J.A. Nelder, Generalized Linear Models,
// 2nd ed., 1989, ch. 6). Unlike least squares on ln(counts) it takes empty bins
// as they are and has no bias from the logarithm. Autocorrelation of the
// counted positions changes the error of the fit, which is Jackknife's
// matter, not its value.
//
// start is where to begin, nil for a start from the counts themselves. The
// fit fails, and reports false, with fewer than three bins that are not empty
// or without convergence. u should be of order one. It panics if the lengths
// differ.
func FitLogParabola(u, counts []float64, start *LogParabola) (LogParabola, bool) {
	if len(u) != len(counts) {
		panic("estimate: slice length mismatch")
	}
	filled, total := 0, 0.0
	for _, n := range counts {
		if n > 0 {
			filled++
		}
		total += n
	}
	if filled < 3 {
		return LogParabola{}, false
	}
	// In units of the total the logarithms stay near 0 whatever the run's length.
	var c LogParabola
	if start != nil {
		c = *start
		c[0] -= math.Log(total)
	} else {
		c = firstGuess(u, counts, total)
	}
	for range 50 {
		step, ok := newton(u, counts, total, c)
		if !ok {
			return LogParabola{}, false
		}
		// A step that would change a bin's expectation more than e-fold is
		// shortened: far from the maximum the quadratic model overshoots.
		largest := 0.0
		for _, x := range u {
			largest = math.Max(largest, math.Abs(step[0]+x*(step[1]+x*step[2])))
		}
		short := 1.0
		if largest > 1 {
			short = 1 / largest
		}
		for k := range c {
			c[k] += short * step[k]
		}
		// Convergence is quadratic: after this step the error is about its square.
		if largest < 1e-7 {
			c[0] += math.Log(total)
			return c, true
		}
	}
	return LogParabola{}, false
}

// newton returns the step that solves (Σ λ·t·tᵀ)·step = Σ (n - λ)·t, t = (1, u, u²).
func newton(u, counts []float64, total float64, c LogParabola) (LogParabola, bool) {
	var moment [5]float64
	var score [3]float64
	for i, x := range u {
		expected := math.Exp(c[0] + x*(c[1]+x*c[2]))
		excess := counts[i]/total - expected
		for k := range moment {
			moment[k] += expected
			expected *= x
		}
		score[0] += excess
		score[1] += excess * x
		score[2] += excess * x * x
	}
	return solve3(moment, score)
}

// solve3 solves the 3×3 system whose matrix has moment[i+j] in row i and column
// j, by LDLᵀ: a general solver spends most of its time on its generality, and
// an interval takes a thousand of these. It reports false where the matrix is
// not safely positive definite.
func solve3(moment [5]float64, b [3]float64) (x LogParabola, ok bool) {
	const smallest = 1e-13 // a pivot that lost more digits than this is noise
	d0 := moment[0]
	l1, l2 := moment[1]/d0, moment[2]/d0
	d1 := moment[2] - l1*moment[1]
	l21 := (moment[3] - l1*moment[2]) / d1
	d2 := moment[4] - l2*moment[2] - l21*l21*d1
	if !(d0 > 0 && d1 > smallest*moment[2] && d2 > smallest*moment[4]) {
		return LogParabola{}, false
	}
	y0 := b[0]
	y1 := b[1] - l1*y0
	y2 := b[2] - l2*y0 - l21*y1
	x[2] = y2 / d2
	x[1] = y1/d1 - l21*x[2]
	x[0] = y0/d0 - l1*x[1] - l2*x[2]
	return x, true
}

// firstGuess is the least-squares parabola through ln(counts + 1/2).
func firstGuess(u, counts []float64, total float64) LogParabola {
	design := mat.NewDense(len(u), 3, nil)
	logs := mat.NewVecDense(len(u), nil)
	for i, x := range u {
		w := math.Sqrt(counts[i] + 0.5)
		design.SetRow(i, []float64{w, w * x, w * x * x})
		logs.SetVec(i, w*math.Log((counts[i]+0.5)/total))
	}
	var c mat.VecDense
	if c.SolveVec(design, logs) != nil {
		return LogParabola{math.Log(1 / float64(len(u)))}
	}
	return LogParabola{c.AtVec(0), c.AtVec(1), c.AtVec(2)}
}

// At returns ln(λ) at u.
func (c LogParabola) At(u float64) float64 { return c[0] + u*(c[1]+u*c[2]) }

// Vertex returns where the curve is highest, and ln(λ) there. It reports false
// where the curve has no maximum.
func (c LogParabola) Vertex() (u, height float64, ok bool) {
	if !(c[2] < 0) {
		return 0, 0, false
	}
	u = -c[1] / (2 * c[2])
	return u, c.At(u), true
}

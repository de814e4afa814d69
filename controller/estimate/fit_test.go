package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

func bins(n int, from, to float64) []float64 {
	u := make([]float64, n)
	for i := range u {
		u[i] = from + (to-from)*(float64(i)+0.5)/float64(n)
	}
	return u
}

// Counts that lie on a parabola give it back, near and far from the start.
func TestFitGivesBackAParabola(t *testing.T) {
	for _, want := range []LogParabola{{5, 0, -0.5}, {10, 3, -1}, {-2, -1, 2}, {3, 0, 0}} {
		u := bins(30, -1.5, 1.5)
		counts := make([]float64, len(u))
		for i, x := range u {
			counts[i] = math.Exp(want.At(x))
		}
		for _, start := range []*LogParabola{nil, {1, 0, 0}} {
			got, ok := FitLogParabola(u, counts, start)
			for k := range got {
				// Newton's last step is below 1e-7, so that what is left is its square.
				if !ok || !within(got[k], want[k], 1e-10) {
					t.Errorf("from %v: fit %v, want %v", start, got, want)
					break
				}
			}
		}
	}
}

// The maximum-likelihood fit of a normal distribution's histogram is the
// sample's mean and variance where nothing is cut off: an independent route to
// the same numbers, by W.F. Sheppard's correction w²/12 for bins of width w
// (Proc. London Math. Soc. 29, 353 (1898)).
func TestFitAgainstMoments(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	u := bins(120, -6, 6)
	const width = 0.1
	counts := make([]float64, len(u))
	var sum, square float64
	const size = 100000
	for range size {
		x := 0.3 + 0.8*r.NormFloat64()
		sum += x
		square += x * x
		counts[int((x+6)/width)]++
	}
	mean := sum / size
	variance := square/size - mean*mean
	c, ok := FitLogParabola(u, counts, nil)
	if !ok {
		t.Fatal("no fit")
	}
	vertex, _, ok := c.Vertex()
	// Binning adds noise of width/√12 per value to the mean: 1e-4 here.
	if !ok || !within(vertex, mean, 5e-4) {
		t.Errorf("vertex %v, want the mean %v", vertex, mean)
	}
	if got := -1 / (2 * c[2]); !within(got, variance+width*width/12, 1e-3) {
		t.Errorf("variance %v, want %v", got, variance+width*width/12)
	}
}

// Few counts give no bias beyond that of maximum likelihood: the mean fitted
// height at 0 over many samples of about 300 counts. Least squares on
// logarithms would be off by 0.05 and fail on empty bins.
func TestFitFewCounts(t *testing.T) {
	want := LogParabola{2.5, 0.5, -0.4}
	u := bins(40, -1.5, 1.5)
	src := rand.NewPCG(7, 8)
	const repeats = 2000
	var sum, square float64
	for range repeats {
		counts := make([]float64, len(u))
		for i, x := range u {
			counts[i] = distuv.Poisson{Lambda: math.Exp(want.At(x)), Src: src}.Rand()
		}
		c, ok := FitLogParabola(u, counts, nil)
		if !ok {
			t.Fatal("no fit")
		}
		sum += c[0]
		square += c[0] * c[0]
	}
	mean := sum / repeats
	se := math.Sqrt((square/repeats - mean*mean) / repeats)
	// The bias of a log mean is -1/(2n) with n the effective count at 0, about
	// 13 bins' worth of 12 counts: -0.003, allowed for beside 3.5 standard errors.
	if !(math.Abs(mean-want[0]) < 3.5*se+0.004) {
		t.Errorf("mean height %v ± %v, want %v", mean, se, want[0])
	}
}

func TestFitRefuses(t *testing.T) {
	u := bins(10, -1, 1)
	counts := make([]float64, len(u))
	counts[2], counts[3] = 5, 7
	if c, ok := FitLogParabola(u, counts, nil); ok {
		t.Errorf("two filled bins give %v, want no fit", c)
	}
	if _, _, ok := (LogParabola{1, 0, 0.5}).Vertex(); ok {
		t.Error("a valley has a highest point")
	}
}

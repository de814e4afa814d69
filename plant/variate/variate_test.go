package variate

import (
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// The reference output for the state {1, 2, 3, 4}, as the generator's
// re-implementations test it (values from memory).
func TestBitsMatchReference(t *testing.T) {
	n := Normal{s: [4]uint64{1, 2, 3, 4}}
	for i, want := range []uint64{
		41943041, 58720359, 3588806011781223, 3591011842654386,
		9228616714210784205, 9973669472204895162,
	} {
		if got := n.Uint64(); got != want {
			t.Errorf("output %d = %d, want %d", i, got, want)
		}
	}
}

// With strips of equal area the whole ziggurat has the area under half the
// bell, √(π/2), plus what sticks out, and the known edges of Marsaglia and
// Tsang, J. Stat. Softw. 5(8), 1 (2000), are 3.442619855899 for 128 strips and
// 3.6541528853610088 for 256 (from memory): the more strips, the further out.
func TestStripsClose(t *testing.T) {
	if !(edge > 3.6541528853610088 && edge < 5) {
		t.Errorf("the tail of %d strips begins at %v, want beyond that of 256", layers, edge)
	}
	borders := strips(edge)
	// Near the summit x is the root of what is left of the height: half the digits.
	if top := borders[layers]; !(top < 1e-6) {
		t.Errorf("the top strip ends at %v, want 0", top)
	}
	area := edge*density(edge) + math.Sqrt(math.Pi/2)*math.Erfc(edge/math.Sqrt2)
	for i := 1; i < layers; i++ {
		if got := borders[i] * (density(borders[i+1]) - density(borders[i])); !(math.Abs(got-area) < 1e-12) {
			t.Errorf("strip %d has area %v, want %v", i, got, area)
		}
	}
}

// Kolmogorov-Smirnov against the standard library's error function, whole and
// beyond the edge, where the tail's own method works.
func TestDistribution(t *testing.T) {
	const size = 4 << 20
	x := make([]float64, size)
	NewNormal(1, 0).Fill(x)
	slices.Sort(x)

	// 1.95/sqrt(n) is the 0.1 % point of the Kolmogorov distribution.
	worst := 0.0
	for i, v := range x {
		cdf := math.Erfc(-v/math.Sqrt2) / 2
		worst = max(worst, math.Abs(cdf-float64(i)/size), math.Abs(cdf-float64(i+1)/size))
	}
	if limit := 1.95 / math.Sqrt(size); !(worst < limit) {
		t.Errorf("largest distance from the normal distribution %.3g, want < %.3g", worst, limit)
	}

	tail := x[sort64(x, edge):]
	want := size * math.Erfc(edge/math.Sqrt2) / 2
	if d := float64(len(tail)) - want; !(math.Abs(d) < 3.5*math.Sqrt(want)) {
		t.Errorf("%d variates beyond %v, want %.0f within 3.5 standard errors", len(tail), edge, want)
	}
	var mean float64
	for _, v := range tail {
		mean += v / float64(len(tail))
	}
	// Mean of a normal beyond u is phi(u)/Q(u); its sd there is about 0.25.
	exact := distuv.UnitNormal.Prob(edge) / distuv.UnitNormal.Survival(edge)
	if d := mean - exact; !(math.Abs(d) < 3.5*0.25/math.Sqrt(float64(len(tail)))) {
		t.Errorf("mean beyond the edge %.4f, want %.4f", mean, exact)
	}
}

func sort64(x []float64, v float64) int {
	i, _ := slices.BinarySearch(x, v)
	return i
}

// Variance, skewness, kurtosis and the correlation of neighbours, each within
// 3.5 standard errors of a normal's.
func TestMoments(t *testing.T) {
	const size = 1 << 20
	x := make([]float64, size)
	NewNormal(7, 3).Fill(x)
	root := math.Sqrt(size)
	for _, tt := range []struct {
		name      string
		got, want float64
		se        float64
	}{
		{"mean", stat.Mean(x, nil), 0, 1 / root},
		{"variance", stat.Variance(x, nil), 1, math.Sqrt2 / root},
		{"skewness", stat.Skew(x, nil), 0, math.Sqrt(6) / root},
		{"excess kurtosis", stat.ExKurtosis(x, nil), 0, math.Sqrt(24) / root},
		{"neighbours", stat.Correlation(x[1:], x[:size-1], nil), 0, 1 / root},
	} {
		if !(math.Abs(tt.got-tt.want) < 3.5*tt.se) {
			t.Errorf("%s = %v, want %v within %v", tt.name, tt.got, tt.want, 3.5*tt.se)
		}
	}
}

func TestStreams(t *testing.T) {
	a, b, c := make([]float64, 1<<16), make([]float64, 1<<16), make([]float64, 1<<16)
	NewNormal(1, 0).Fill(a)
	NewNormal(1, 1).Fill(b)
	same := NewNormal(1, 0)
	for i := range c {
		c[i] = same.Next()
	}
	if !slices.Equal(a, c) {
		t.Error("one at a time gives another stream than a whole slice")
	}
	if r := stat.Correlation(a, b, nil); !(math.Abs(r) < 3.5/256) {
		t.Errorf("streams 0 and 1 correlate: %v", r)
	}
}

func TestFillDoesNotAllocate(t *testing.T) {
	n, x := NewNormal(1, 0), make([]float64, 512)
	if a := testing.AllocsPerRun(10, func() { n.Fill(x) }); a != 0 {
		t.Errorf("%v allocations a slice, want 0", a)
	}
}

func BenchmarkFill(b *testing.B) {
	n, x := NewNormal(1, 0), make([]float64, 1024)
	for b.Loop() {
		n.Fill(x)
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(x)), "ns/variate")
}

package estimate

import (
	"math"
	"math/rand/v2"
	"testing"
)

// ar1 is the autoregression x' = phi·x + g, g standard normal.
func ar1(r *rand.Rand, phi float64, n int) []float64 {
	x := make([]float64, n)
	last := r.NormFloat64() / math.Sqrt(1-phi*phi)
	for i := range x {
		x[i] = last
		last = phi*last + r.NormFloat64()
	}
	return x
}

// The standard error that blocking shows at each level, against the exact one
// of an autoregression: the variance of a mean of m values is
// (var/m)·(1 + 2·Σ_{d<m} (1-d/m)·phi^d). Its plateau is the error of the mean,
// 0.0195313 for phi = 0.9 and 2^18 values.
func TestBlockAgainstAutoregression(t *testing.T) {
	const phi, n = 0.9, 1 << 18
	levels := Block(ar1(rand.New(rand.NewPCG(1, 2)), phi, n))
	for k, b := range levels[:12] {
		m := 1 << k
		sum := 1.0
		for d := 1; d < m; d++ {
			sum += 2 * (1 - float64(d)/float64(m)) * math.Pow(phi, float64(d))
		}
		want := math.Sqrt(sum / (1 - phi*phi) / n)
		// Uncertainty takes the blocks as independent; correlated ones, at the
		// first levels, scatter (1+phi²)/(1-phi²) times as much in the square.
		tol := 3.5 * b.Uncertainty
		if k < 6 {
			tol *= math.Sqrt((1 + phi*phi) / (1 - phi*phi))
		}
		if !(math.Abs(b.StandardError-want) < tol) {
			t.Errorf("level %d: standard error %.6f, want %.6f within %.6f", k, b.StandardError, want, tol)
		}
	}
	if last := levels[9]; !(math.Abs(last.StandardError-0.0195313) < 3.5*last.Uncertainty) {
		t.Errorf("plateau %v, want 0.0195313", last.StandardError)
	}
}

// The interval of a mean covers it in 95 % of repeats, whatever the
// correlation: 4,000 repeats know the share to 0.35 %, the tolerance is three
// of that. With phi = 0.98 the 512 values are 5 correlation times long: that
// must be refused, not underestimated.
func TestMeanCovers(t *testing.T) {
	const repeats = 4000
	for _, tt := range []struct {
		phi     float64
		n       int
		refused float64 // at most this share
	}{
		{0, 128, 0.001},
		{0.2, 128, 0.001},
		{0.5, 256, 0.01},
		{0.9, 1024, 0.05},
	} {
		r := rand.New(rand.NewPCG(3, 4))
		held, known := 0, 0
		for range repeats {
			v := Mean(ar1(r, tt.phi, tt.n))
			if v.Known() {
				known++
			}
			if v.Holds(0) {
				held++
			}
		}
		if share := 1 - float64(known)/repeats; !(share <= tt.refused) {
			t.Errorf("phi %v: %.2f %% of the series refused, want at most %.2f %%", tt.phi, 100*share, 100*tt.refused)
		}
		if share := float64(held) / float64(known); !(math.Abs(share-0.95) < 0.0105) {
			t.Errorf("phi %v: %.2f %% of the intervals hold the mean, want 95 %%", tt.phi, 100*share)
		}
	}
}

func TestMeanRefusesWhatIsTooShort(t *testing.T) {
	if v := Mean(make([]float64, fewestBlocks-1)); v.Known() {
		t.Errorf("15 values give %v, want no estimate", v)
	}
	slow := make([]float64, 256) // half a period of a slow drift
	for i := range slow {
		slow[i] = math.Sin(float64(i) / 80)
	}
	if v := Mean(slow); v.Known() {
		t.Errorf("a drift gives %v, want no estimate", v)
	}
}

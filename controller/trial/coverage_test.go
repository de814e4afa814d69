package trial_test

import (
	"context"
	"math"
	"runtime"
	"sync"
	"testing"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trial"
	"brinkwell/plant/motion"
)

// Of 2,000 short runs of a nearly ideal loop, 93 to 97 % must have the truth
// within their 95 % intervals: 2,000 repeats know the share to 0.5 %, and the
// half tick by which any sampled loop is late moves the barrier by 0.2
// standard errors, which costs 0.3 %. The truth is the Boltzmann distribution
// of two parabolas in closed form.
func TestIntervalsCoverTheTruth(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical: 2,000 runs")
	}
	const repeats, barrier = 2000, 1.0
	config := trial.Config{
		Oscillator:   motion.Oscillator{Omega0: 1, Quality: 2, Stiffness: 1, KT: 1},
		Temperature:  1,
		HalfDistance: math.Sqrt(2 * barrier),
		Rate:         50,
		Duration:     1966.08, // 96 batches of 1,024 ticks
		WarmUp:       40,
		Tolerance:    trial.Tolerance{Barrier: 0.1, Temperature: 0.1},
	}
	// <|x|> = x1 + σ·φ(a)/Φ(a), a = x1/σ.
	a := math.Sqrt(2 * barrier)
	meanAbs := a + math.Exp(-a*a/2)/math.Sqrt(2*math.Pi)/(math.Erfc(-a/math.Sqrt2)/2)
	quantities := []struct {
		name  string
		truth float64
		of    func(r trial.Report) estimate.Value
	}{
		{"barrier", barrier, func(r trial.Report) estimate.Value { return r.Realised.Barrier }},
		{"barrier from parabolas", barrier, func(r trial.Report) estimate.Value { return r.Realised.BarrierFromParabolas }},
		{"barrier out of the lower well", barrier, func(r trial.Report) estimate.Value { return r.Realised.BarrierLower }},
		{"distance", 2 * a, func(r trial.Report) estimate.Value { return r.Realised.Distance }},
		{"stiffness", 1, func(r trial.Report) estimate.Value { return r.Realised.Stiffness }},
		{"tilt", 0, func(r trial.Report) estimate.Value { return r.Realised.Tilt }},
		{"kinetic temperature", 1, func(r trial.Report) estimate.Value { return r.Realised.KineticTemperature }},
		{"width temperature", 1, func(r trial.Report) estimate.Value { return r.Realised.WidthTemperature }},
		{"mean |x|", meanAbs, func(r trial.Report) estimate.Value { return r.Realised.MeanAbsPosition }},
		{"share above", 0.5, func(r trial.Report) estimate.Value { return r.Realised.UpperShare }},
		{"identity", 0, func(r trial.Report) estimate.Value { return r.Checks.StationaryIdentity.Difference }},
	}

	held := make([]int, len(quantities))
	var mu sync.Mutex
	var wg sync.WaitGroup
	seeds := make(chan uint64)
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for seed := range seeds {
				c := config
				c.Seed = seed
				b, err := trial.New(c)
				if err != nil {
					t.Error(err)
					continue
				}
				r, err := b.Run(context.Background(), nil)
				if err != nil {
					t.Error(err)
					continue
				}
				mu.Lock()
				for k, q := range quantities {
					if q.of(r).Holds(q.truth) {
						held[k]++
					}
				}
				mu.Unlock()
			}
		})
	}
	for seed := range uint64(repeats) {
		seeds <- seed
	}
	close(seeds)
	wg.Wait()
	for k, q := range quantities {
		share := float64(held[k]) / repeats
		t.Logf("%-30s %.2f %%", q.name, 100*share)
		if !(share >= 0.93 && share <= 0.97) {
			t.Errorf("%s: %.1f %% of the intervals hold the truth, want 93 to 97 %%", q.name, 100*share)
		}
	}
}

package plant_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/stat"

	"brinkwell/controller/trace"
)

// What the sensor adds is white and normal, of the standard deviation asked,
// and knows nothing of the motion or of what the loop does with it. Each
// number within 3.5 standard errors of independent normal draws; two dozen of
// them would miss once in 90 such tests.
func TestSensorNoiseIsWhite(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	t.Parallel()
	const n = 1 << 20
	c := config()
	noise, x, v := make([]float64, n), make([]float64, n), make([]float64, n)
	p := newPlant(t, c)
	closed(t, p, 0, n, func(tick int64, s *trace.Sample) {
		noise[tick] = (s.Measured - s.Position) / c.Sensor.NoiseSD()
		x[tick], v[tick] = s.Position, s.Velocity
	})
	if len(p.Acted(nil)) < 1000 {
		t.Error("the loop hardly switched")
	}
	root := math.Sqrt(n)
	check := func(name string, got, want, se float64) {
		t.Helper()
		if z := (got - want) / se; !(math.Abs(z) < 3.5) {
			t.Errorf("%s is %.5f, want %g: off by %.1f standard errors", name, got, want, z)
		}
	}
	check("mean over the standard deviation asked", stat.Mean(noise, nil), 0, 1/root)
	check("variance over that asked", stat.Variance(noise, nil), 1, math.Sqrt2/root)
	check("excess kurtosis", stat.ExKurtosis(noise, nil), 0, math.Sqrt(24)/root)
	for _, lag := range []int{1, 2, 3, 4, 5, 7, 11, 77, 154, 511, 512, 513, 1024} {
		check(fmt.Sprintf("correlation over %d ticks", lag), stat.Correlation(noise[lag:], noise[:n-lag], nil), 0, 1/math.Sqrt(float64(n-lag)))
	}
	// White noise times anything independent of it is white.
	check("correlation with the position", stat.Correlation(noise, x, nil), 0, 1/root)
	check("correlation with the velocity", stat.Correlation(noise, v, nil), 0, 1/root)
	check("correlation with the next tick's kick", stat.Correlation(noise[:n-1], changes(v), nil), 0, 1/root)
	// A tick takes two thermal variates and one of the sensor: of one stream,
	// the kicks would have come from the draws of twice their number.
	for odd := range 2 {
		twice := make([]float64, n/2-1)
		for i := range twice {
			twice[i] = noise[2*i+odd]
		}
		check("correlation of equal draws", stat.Correlation(twice, changes(v[:n/2]), nil), 0, 1/math.Sqrt(n/2))
	}
}

func changes(v []float64) []float64 {
	d := make([]float64, len(v)-1)
	for i := range d {
		d[i] = v[i+1] - v[i]
	}
	return d
}

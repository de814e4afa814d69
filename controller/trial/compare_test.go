package trial_test

import (
	"context"
	"math"
	"testing"

	"brinkwell/controller/trial"
)

// A bench compared with itself differs by nothing; compared with another
// latency by what the two differ, to a fraction of their own intervals, since
// both had the same kicks.
func TestCompareIsPaired(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	configs := []trial.Config{demo(), demo(), demo()}
	configs[1].Latency = 4e-6
	configs[2].Duration = 2
	c, err := trial.Compare(context.Background(), configs, nil)
	if err != nil {
		t.Fatal(err)
	}
	if len(c.Reports) != 3 || len(c.Differences) != 2 {
		t.Fatalf("%d reports, %d differences, want 3 and 2", len(c.Reports), len(c.Differences))
	}
	d, a, b := c.Differences[0], c.Reports[0], c.Reports[1]
	if !d.Paired || c.Differences[1].Paired {
		t.Error("runs of one length are not paired, or runs of different lengths are")
	}
	// Predicted: 0.965 at 1 µs, 0.950 at 4 µs.
	x, y := a.Checks.StationaryIdentity.FromPower, b.Checks.StationaryIdentity.FromPower
	want := b.Predicted.KineticTemperature - a.Predicted.KineticTemperature
	if !(math.Abs(d.TemperatureFromPower.Value-want) < 0.01+d.TemperatureFromPower.Half()) {
		t.Errorf("difference %v ± %v, predicted %v", d.TemperatureFromPower.Value, d.TemperatureFromPower.Half(), want)
	}
	if !(math.Abs(d.TemperatureFromPower.Value-(y.Value-x.Value)) < 1e-3) {
		t.Errorf("the difference, %v, is not that of the two, %v", d.TemperatureFromPower.Value, y.Value-x.Value)
	}
	if together := math.Hypot(a.Realised.KineticTemperature.Half(), b.Realised.KineticTemperature.Half()); !(d.KineticTemperature.Half() < 0.7*together) {
		t.Errorf("the interval of the difference, ±%v, is no narrower than that of independent runs, ±%v", d.KineticTemperature.Half(), together)
	}
}

package trial

import (
	"strings"
	"testing"

	"brinkwell/controller/estimate"
)

func TestJudge(t *testing.T) {
	for _, tt := range []struct {
		name         string
		realised     estimate.Value
		within, sure bool
		says         string
	}{
		{"inside", estimate.Value{Value: 4.1, Low: 4, High: 4.2}, true, true, "+2.5 % of what was asked, within"},
		{"outside", estimate.Value{Value: 3, Low: 2.9, High: 3.1}, false, true, "-25.0 % of what was asked, NOT within"},
		{"inside, not surely", estimate.Value{Value: 4.3, Low: 4.1, High: 4.6}, true, false, "run longer"},
		{"outside, not surely", estimate.Value{Value: 3.4, Low: 3.2, High: 3.6}, false, false, "run longer"},
		{"wider than the tolerance", estimate.Value{Value: 4, Low: 3, High: 5}, true, false, "run longer"},
		{"on the limit", estimate.Value{Value: 4.5, Low: 4.5, High: 4.5}, true, true, "within"},
		{"not known", estimate.Unknown("the run is too short"), false, false, "cannot be judged: the run is too short"},
	} {
		// 12.5 % of 4 is a sum of powers of two: the limit itself is exact.
		j := judge(4, tt.realised, "test", 0.125)
		if j.Within != tt.within || j.Sure != tt.sure || !strings.Contains(j.String(), tt.says) {
			t.Errorf("%s: within %v, sure %v, %q", tt.name, j.Within, j.Sure, j)
		}
	}
}

// Without a visit to the threshold the parabolas' barrier is judged, and the
// verdict says so.
func TestVerdictFallsBack(t *testing.T) {
	r := Landscape{
		Barrier:              estimate.Unknown("not crossed"),
		BarrierFromParabolas: estimate.Value{Value: 14, Low: 13.9, High: 14.1},
		KineticTemperature:   estimate.Value{Value: 1, Low: 0.99, High: 1.01},
	}
	v := Tolerance{Barrier: 0.1, Temperature: 0.05}.judge(Asked{Barrier: 14}, r)
	if !v.Passes || v.Barrier.From != "fitted parabolas" {
		t.Errorf("passes %v from the %s, want a pass from the fitted parabolas", v.Passes, v.Barrier.From)
	}
	r.KineticTemperature.Value = 1.06
	if v := (Tolerance{Barrier: 0.1, Temperature: 0.05}).judge(Asked{Barrier: 14}, r); v.Passes {
		t.Error("a temperature 6 % off passes a tolerance of 5 %")
	}
}

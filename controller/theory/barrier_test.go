package theory

import (
	"math"
	"testing"
)

func TestNoisyBarrier(t *testing.T) {
	// b = 5, to the digits given: an independent evaluation of b-a·s·√(2/π),
	// which a simulation confirmed.
	for s, want := range map[float64]float64{0.1: 4.74769, 0.3: 4.24306, 0.5: 3.73843} {
		got, r := NoisyBarrier(5, s)
		if !(math.Abs(got-want) <= 6e-6) || !r.Inside() {
			t.Errorf("NoisyBarrier(5, %g) = %v, want %v (%v)", s, got, want, r.Reasons)
		}
		// The potential's own top and, far from the noise, its bottom.
		a := math.Sqrt(10)
		if d := NoisyPotential(0, 5, s) - NoisyPotential(a, 5, s); !(math.Abs(d-want) <= 1e-5) {
			t.Errorf("NoisyPotential at s = %g: top %v above the centre, want %v", s, d, want)
		}
	}
	if got := NoisyPotential(1, 2, 0); got != -1.5 {
		t.Errorf("without noise %v, want 1/2-2", got)
	}
	if _, r := NoisyBarrier(2, 0.51); r.Inside() {
		t.Error("s above a/4 counted as inside")
	}
}

func TestApparentBarrier(t *testing.T) {
	// b = 5: five-digit evaluations of the histogram's convolution.
	for s, want := range map[float64]float64{0.05: 4.86932, 0.1: 4.72977, 0.2: 4.42593, 0.4: 3.74516} {
		if got := ApparentBarrier(5, s); !(math.Abs(got-want) <= 6e-6) {
			t.Errorf("ApparentBarrier(5, %g) = %v, want %v", s, got, want)
		}
	}
	// The convolution itself.
	density := func(x float64) float64 {
		const s, a = 0.3, 2.0
		f := func(y float64) float64 {
			return math.Exp(-(math.Abs(y)-a)*(math.Abs(y)-a)/2 - (x-y)*(x-y)/(2*s*s))
		}
		return panels(f, x-12*s, 0, 0.05) + panels(f, 0, x+12*s, 0.05)
	}
	want := math.Log(density(2) / density(0))
	if got := ApparentBarrier(2, 0.3); !within(got, want, 1e-5) { // the other well at the centre
		t.Errorf("ApparentBarrier(2, 0.3) = %v, want %v", got, want)
	}
}

func TestBandBarrierAndToggle(t *testing.T) {
	if got := BandBarrier(2, 0.1); !within(got, 2*1.05*1.05, 1e-14) {
		t.Errorf("BandBarrier %v, want b(1+h/a)²", got)
	}
	// Normal tails at 1 to 5 standard deviations (any table of the normal
	// distribution), five digits.
	for i, want := range []float64{0.15866, 0.02275, 1.3499e-3, 3.1671e-5, 2.8665e-7} {
		if got := ToggleProbability(0.2*float64(i+1), 0.2); !within(got, want, 3e-5) {
			t.Errorf("ToggleProbability at %d sd = %v, want %v", i+1, got, want)
		}
	}
	if ToggleProbability(0, 0) != 0.5 || ToggleProbability(1, 0) != 0 {
		t.Error("ToggleProbability without noise")
	}
}

package theory

import (
	"fmt"
	"math"
)

// A Case is a threshold-switched double well in reduced units. Zero means
// none for every imperfection.
type Case struct {
	Quality float64 // Q, positive
	Barrier float64 // b of the untilted wells, k_B·T, positive; centres at ±√(2b)
	Offset  float64 // threshold off the midpoint, σ; tilts the wells by 2·√(2b)·Offset
	// Delay is the mean time from the crossing to the actuation, 1/ω₀:
	// latency, half a tick and the lags of sensor and output.
	Delay    float64
	HalfBand float64 // of the comparator about its threshold, σ; not negative
	Noise    float64 // standard deviation of one sample's white sensor noise, σ; needs a Tick
	Tick     float64 // sampling interval, 1/ω₀; 0 for a comparator that never sleeps
}

// Validate returns an error that names the first field that is out of its
// domain, with its value and the domain. A delay shorter than half a tick is
// accepted: a loop that looks ahead has one, negative even.
func (c Case) Validate() error {
	for _, f := range []struct {
		name  string
		value float64
		ok    bool
		want  string
	}{
		{"quality", c.Quality, c.Quality >= 1e-6 && c.Quality <= 1e9, "in [1e-6, 1e9]"},
		{"barrier", c.Barrier, c.Barrier >= minBarrier && c.Barrier <= maxBarrier, fmt.Sprintf("in [%g, %g] kT", float64(minBarrier), float64(maxBarrier))},
		{"threshold offset", c.Offset, math.Abs(c.Offset) < math.Sqrt(2*c.Barrier), "between the well centres, in σ"},
		{"delay", c.Delay, math.Abs(c.Delay) < 2*math.Pi, "shorter than a period (2π/ω₀)"},
		{"half band", c.HalfBand, c.HalfBand >= 0 && c.HalfBand < math.Sqrt(2*c.Barrier), "from 0 to less than the wells' distance from the midpoint, in σ"},
		{"sensor noise", c.Noise, c.Noise >= 0 && c.Noise <= 1e6, "in [0, 1e6] σ"},
		{"tick", c.Tick, c.Tick >= 0 && c.Tick < 2*math.Pi, "in [0, 2π) /ω₀"},
	} {
		if !f.ok {
			return fmt.Errorf("theory: %s %g must be %s", f.name, f.value, f.want)
		}
	}
	if c.Noise > 0 && c.Tick == 0 {
		return fmt.Errorf("theory: sensor noise %g σ a sample needs a tick above 0", c.Noise)
	}
	return nil
}

// Barriers between which every function of this package is finite: below,
// two wells have no meaning, above, e^b leaves double precision.
const (
	minBarrier = 0.01
	maxBarrier = 300
)

// Well returns the ideal double well of c.
func (c Case) Well() Well { return Well{Barrier: c.Barrier, Offset: c.Offset} }

// mustBarrier panics unless b is a barrier that the package can handle.
func mustBarrier(b float64) {
	if !(b >= minBarrier && b <= maxBarrier) {
		panic("theory: barrier outside [0.01, 300] kT")
	}
}

// A Range says whether a prediction is inside the range in which it was
// checked, and if not, why not.
type Range struct {
	// Reasons is empty inside the range; otherwise each entry is a sentence
	// part with the quantity, its value and the limit.
	Reasons []string
}

// Inside reports whether the prediction holds.
func (r Range) Inside() bool { return len(r.Reasons) == 0 }

func (r *Range) require(ok bool, format string, args ...any) {
	if !ok {
		r.Reasons = append(r.Reasons, fmt.Sprintf(format, args...))
	}
}

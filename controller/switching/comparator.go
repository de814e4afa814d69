// Package switching decides from a position which level to apply, when it may
// change again, and where the threshold is to be while the sensor drifts.
//
// It knows positions, levels and ticks, nothing of clocks, plants or boards;
// the code that a bench tests is the code that drives a board.
package switching

import "brinkwell/controller/trace"

// A Comparator turns a position into a level, with a dead band. It goes to
// the upper level strictly above Threshold + HalfBand, to the lower strictly
// below Threshold - HalfBand, and holds otherwise, edges included. A position
// that is not a number holds too.
//
// The zero value switches at 0 without a band and starts low. A Comparator
// must not be used by two goroutines at once.
type Comparator struct {
	Threshold float64     // m
	HalfBand  float64     // half the width of the dead band, m; not negative
	Level     trace.Level // the present level
}

// Decide returns the level for a measured position x, in metres.
func (c *Comparator) Decide(x float64) trace.Level {
	d := x - c.Threshold
	if d > c.HalfBand {
		c.Level = trace.Upper
	} else if d < -c.HalfBand {
		c.Level = trace.Lower
	}
	return c.Level
}

package switching_test

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"

	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
)

// On an edge of the dead band, at 0.375 nm or 0.625 nm, the level holds. (A
// nanometre that is a power of two keeps the edges exact.)
func ExampleComparator() {
	const nm = 1.0 / (1 << 30)
	c := switching.Comparator{Threshold: 0.5 * nm, HalfBand: 0.125 * nm}
	for _, x := range []float64{0.625, 0.75, 0.375, 0.25} {
		fmt.Printf("%.3f nm: %s\n", x, c.Decide(x*nm))
	}
	// Output:
	// 0.625 nm: lower
	// 0.750 nm: upper
	// 0.375 nm: upper
	// 0.250 nm: lower
}

func TestNaNHolds(t *testing.T) {
	c := switching.Comparator{Level: trace.Upper}
	if got := c.Decide(math.NaN()); got != trace.Upper {
		t.Errorf("Decide(NaN) = %v, want the level held, upper", got)
	}
}

// Whatever the positions, the level after each is the side of the last one
// that left the band.
func TestLastExcursionDecides(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := switching.Comparator{
			Threshold: rapid.Float64Range(-1, 1).Draw(t, "threshold"),
			HalfBand:  rapid.Float64Range(0, 1).Draw(t, "half band"),
		}
		want := trace.Lower
		for _, x := range rapid.SliceOf(rapid.Float64Range(-3, 3)).Draw(t, "positions") {
			switch d := x - c.Threshold; {
			case math.Abs(d) <= c.HalfBand:
			case d > 0:
				want = trace.Upper
			default:
				want = trace.Lower
			}
			if got := c.Decide(x); got != want {
				t.Fatalf("Decide(%v) = %v, want %v", x, got, want)
			}
		}
	})
}

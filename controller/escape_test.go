package controller_test

import (
	"fmt"
	"math"
	"testing"

	"brinkwell/controller/trace"
)

// sides notes on which side of the threshold the resonator is, every so many
// ticks.
type sides struct {
	stride int64
	seen   []int8
}

func (s *sides) Take(b *trace.Block) error {
	first := (s.stride - b.Start%s.stride) % s.stride
	for i := first; i < int64(len(b.Samples)); i += s.stride {
		side := int8(-1)
		if b.Samples[i].Position > 0 {
			side = 1
		}
		s.seen = append(s.seen, side)
	}
	return nil
}

// decay returns the rate at which the correlation of the side falls between
// two lags, per note, with its error from batches.
func (s *sides) decay(short, long int) (rate, se float64) {
	n := (len(s.seen) - long) / batches
	var first, second [batches]float64
	var a, b float64
	for m := range first {
		for i := m * n; i < (m+1)*n; i++ {
			first[m] += float64(s.seen[i] * s.seen[i+short])
			second[m] += float64(s.seen[i] * s.seen[i+long])
		}
		a += first[m] / batches
		b += second[m] / batches
	}
	// ln(a/b) is linear in the batches' scatter.
	var squares float64
	for m := range first {
		d := first[m]/a - second[m]/b
		squares += d * d
	}
	span := float64(long - short)
	return math.Log(a/b) / span, math.Sqrt(squares/batches/(batches-1)) / span
}

// The slowest decay rate λ₁ of the double well's Klein-Kramers equation, in
// ω₀: eigenvalues computed independently, by Hermite functions in the velocity
// and finite elements in the position (odd mode on the half line), relative
// errors below 4e-4; the rate from well to well is λ₁/2. H. A. Kramers, Physica
// 7, 284 (1940), for the equation.
//
// The correlation of the side is a sum of exponentials whose slowest is λ₁:
// the shorter lag lets the others, which fall at about Q·ω₀ or Γ and faster,
// die out. The tick is so short that its own effect, a loss of 2·x1·v·dt/2 at
// each crossing, is below half the standard error: it lowers the temperature
// by about 0.1·Q·dt/2 at 2 kT, 0.05 at 3 kT, 0.009 at 5 kT, and a rate by the
// barrier times that; for Q < 1 it widens the path to the other well by about
// the thermal velocity times half a tick, 0.4·dt, in a slope of √(2b).
func TestEscapeRate(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct {
		quality, barrier, dt float64
		ticks                int64
		stride               float64 // 1/ω₀
		short                float64 // lag, 1/ω₀
		want                 float64
	}{
		{0.1, 3, 0.01, 30e6, 2, 30, 4.0477116e-3},
		{1, 3, 0.01, 20e6, 1, 12, 1.5919224e-2},
		{10, 3, 0.01, 40e6, 1, 40, 7.72531e-3},
		{100, 3, 0.008, 100e6, 4, 300, 1.15320e-3},
		{1, 5, 0.02, 25e6, 4, 20, 2.0976188e-3},
	} {
		t.Run(fmt.Sprintf("Q=%g/b=%g", c.quality, c.barrier), func(t *testing.T) {
			t.Parallel()
			b := bench{quality: c.quality, barrier: c.barrier, dt: c.dt, seed: uint64(20 + i)}
			s := &sides{stride: int64(math.Round(c.stride / c.dt))}
			b.run(t, c.ticks, s)
			short := int(c.short / c.stride)
			long := short + int(0.7/c.want/c.stride)
			rate, se := s.decay(short, long)
			near(t, "decay rate", rate/c.stride, se/c.stride, c.want, 0)
			if !(se/c.stride < 0.15*c.want) {
				t.Errorf("the error of %.2g is no test of %.2g", se/c.stride, c.want)
			}
		})
	}
}

package switching_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
)

// With a hold-off of three ticks the excursion to the lower side right after
// the change is forgotten.
func ExampleDecider() {
	d := switching.NewDecider(switching.Comparator{HalfBand: 0.5}, 3, nil)
	for _, x := range []float64{1, -1, -1, 0, -1} {
		fmt.Printf("%+g: %s\n", x, d.Decide(x))
	}
	// Output:
	// +1: upper
	// -1: upper
	// -1: upper
	// +0: upper
	// -1: lower
}

func TestHoldOff(t *testing.T) {
	const l, u = trace.Lower, trace.Upper
	nan := math.NaN()
	for _, c := range []struct {
		name      string
		holdOff   int64
		positions []float64
		want      []trace.Level
	}{
		{"none", 0, []float64{1, -1, 1, -1}, []trace.Level{u, l, u, l}},
		{"one tick is none", 1, []float64{1, -1, 1, -1}, []trace.Level{u, l, u, l}},
		{"two", 2, []float64{1, -1, -1, 1, 1, -1}, []trace.Level{u, u, l, l, u, u}},
		{"the sample at the end decides", 3, []float64{1, -1, -1, 1, 1, -1}, []trace.Level{u, u, u, u, u, l}},
		{"in the band at the end holds", 3, []float64{1, -1, -1, 0, 0, -1}, []trace.Level{u, u, u, u, u, l}},
		{"lost samples are ticks", 3, []float64{1, nan, nan, -1, 1, nan, 1}, []trace.Level{u, u, u, l, l, l, u}},
		{"lost sample at the end holds", 2, []float64{1, -1, nan, -1, 1}, []trace.Level{u, u, u, l, l}},
	} {
		d := switching.NewDecider(switching.Comparator{HalfBand: 0.25}, c.holdOff, nil)
		var got []trace.Level
		for _, x := range c.positions {
			got = append(got, d.Decide(x))
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: levels %v, want %v", c.name, got, c.want)
		}
	}
}

// Whatever the positions, two changes are never closer than the hold-off, and
// on every tick that is free the level is that of a comparator which starts
// from the level held.
func TestHoldOffProperty(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := switching.Comparator{
			Threshold: rapid.Float64Range(-1, 1).Draw(t, "threshold"),
			HalfBand:  rapid.Float64Range(0, 1).Draw(t, "half band"),
		}
		holdOff := rapid.Int64Range(0, 12).Draw(t, "hold-off")
		position := rapid.OneOf(rapid.Float64Range(-3, 3), rapid.Just(math.NaN()))
		d := switching.NewDecider(c, holdOff, nil)
		last, level := -holdOff, c.Level
		for n, x := range rapid.SliceOf(position).Draw(t, "positions") {
			tick := int64(n)
			got := d.Decide(x)
			want := level
			if tick-last >= holdOff {
				free := c
				free.Level = level
				want = free.Decide(x)
			}
			if got != want {
				t.Fatalf("tick %d, %d after a change: %v, want %v", tick, tick-last, got, want)
			}
			if got != level {
				if tick-last < holdOff {
					t.Fatalf("changes at ticks %d and %d, closer than %d", last, tick, holdOff)
				}
				last, level = tick, got
			}
		}
	})
}

// What could not be commanded is decided anew at the next tick.
func TestRestore(t *testing.T) {
	d := switching.NewDecider(switching.Comparator{}, 5, nil)
	d.Decide(1)
	d.Restore(trace.Lower)
	if got := d.Decide(1); got != trace.Upper {
		t.Errorf("after a change was taken back the level is %v, want upper", got)
	}
	d.Restore(trace.Upper) // nothing to take back: the hold-off goes on
	if got := d.Decide(-1); got != trace.Upper {
		t.Errorf("one tick into the hold-off the level is %v, want upper", got)
	}
}

func TestNegativeHoldOffPanics(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("a hold-off of -1 ticks did not panic")
		}
	}()
	switching.NewDecider(switching.Comparator{}, -1, nil)
}

func BenchmarkDecide(b *testing.B) {
	for _, c := range []struct {
		name    string
		holdOff int64
		keep    bool
	}{{"holdoff=off/keep=off", 0, false}, {"holdoff=on/keep=off", 10, false}, {"holdoff=off/keep=on", 0, true}} {
		b.Run(c.name, func(b *testing.B) {
			var k *switching.Keeper
			if c.keep {
				k = keeper(b, keeping)
			}
			d := switching.NewDecider(switching.Comparator{}, c.holdOff, k)
			b.ReportAllocs()
			tick := 0
			for b.Loop() {
				d.Decide(square(tick, 500, 1000))
				tick++
			}
		})
	}
}

package switching_test

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"

	"brinkwell/controller/switching"
)

// keeping has a time constant that is long against the dwell times of the
// signals below.
var keeping = switching.KeeperConfig{TimeConstant: 1 << 16, Bound: 0.9, Unvisited: 1 << 16}

func keeper(t testing.TB, c switching.KeeperConfig) *switching.Keeper {
	t.Helper()
	k, err := switching.NewKeeper(c)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

// square is +1 in the first ticks of each period and -1 in the others.
func square(tick, upper, period int) float64 {
	if tick%period < upper {
		return 1
	}
	return -1
}

// drive gives a new Decider a signal and returns what its keeper did.
func drive(t *testing.T, c switching.KeeperConfig, ticks int, signal func(tick int) float64) switching.KeeperState {
	t.Helper()
	k := keeper(t, c)
	d := switching.NewDecider(switching.Comparator{}, 0, k)
	for tick := range ticks {
		d.Decide(signal(tick))
	}
	s := k.State()
	if d.Threshold() != s.Travel {
		t.Errorf("the threshold is at %g, and travelled by %g from 0", d.Threshold(), s.Travel)
	}
	return s
}

func within(got, want, tol float64) bool { return math.Abs(got-want) <= tol }

// A zero that is off from the start is followed as by a first-order lag where
// both sides are visited equally, and in the end for any shares.
func TestKeeperFollowsAStep(t *testing.T) {
	const zero = 0.3
	for _, periods := range []float64{0.5, 1, 3} {
		ticks := int(periods * keeping.TimeConstant)
		s := drive(t, keeping, ticks, func(tick int) float64 { return square(tick, 500, 1000) + zero })
		want := zero * -math.Expm1(-periods)
		// Half a period and an update of 64 ticks against the time constant of
		// 65,536 ticks: the phase at the end.
		if !within(s.Travel, want, 0.01*zero) {
			t.Errorf("after %g time constants the threshold travelled by %.5f, want %.5f", periods, s.Travel, want)
		}
	}
	for _, upper := range []int{50, 200, 500, 950} {
		s := drive(t, keeping, 20*int(keeping.TimeConstant), func(tick int) float64 { return square(tick, upper, 1000) + zero })
		// What is left of the start is exp(-20) over the lesser share.
		if !within(s.Travel, zero, 1e-6*zero) || s.Bounded || s.Frozen != 0 || s.Lowest != 0 || s.Highest < s.Travel {
			t.Errorf("upper for %d of 1,000 ticks: %+v, want a travel of %g", upper, s, zero)
		}
	}
}

// The lag behind a steady drift is drift × time constant, whatever the share
// of either side: a cut-off that moves along, g of the doc comment, is not in
// this signal.
func TestKeeperLag(t *testing.T) {
	const lag = 0.02
	drift := lag / keeping.TimeConstant // a tick
	for _, upper := range []int{100, 500, 800} {
		ticks := 12 * int(keeping.TimeConstant)
		s := drive(t, keeping, ticks, func(tick int) float64 {
			return square(tick, upper, 1000) + drift*float64(tick)
		})
		// exp(-12) of the start, weighed by the shares, is left; an update and
		// half a period make up to 1 % of a time constant.
		if got := drift*float64(ticks) - s.Travel; !within(got, lag, 0.015*lag) {
			t.Errorf("upper for %d of 1,000 ticks: lag %.6f, want %g", upper, got, lag)
		}
	}
}

func TestKeeperKeepsTheWantedThreshold(t *testing.T) {
	c := keeping
	c.ExpectedMidpoint = 0.1
	k := keeper(t, c)
	d := switching.NewDecider(switching.Comparator{Threshold: 0.25}, 0, k)
	for tick := range 12 * int(c.TimeConstant) {
		d.Decide(square(tick, 500, 1000) + 0.1)
	}
	// The rounding of sums.
	if got := d.Threshold(); !within(got, 0.25, 1e-12) {
		t.Errorf("with the midpoint where it was expected the threshold is at %g, want 0.25", got)
	}
}

func TestKeeperBound(t *testing.T) {
	c := keeping
	c.Bound = 0.2
	half := 10 * int(c.TimeConstant)
	away := drive(t, c, half, func(tick int) float64 { return square(tick, 500, 1000) - 0.5 })
	if away.Travel != -0.2 || away.Lowest != -0.2 || away.Highest != 0 || !away.Bounded {
		t.Errorf("a zero off by -0.5 with a bound of 0.2: %+v", away)
	}
	back := drive(t, c, 2*half, func(tick int) float64 {
		if tick < half {
			return square(tick, 500, 1000) - 0.5
		}
		return square(tick, 500, 1000) + 0.1
	})
	// exp(-10) of the former step of 0.6 is left.
	if !within(back.Travel, 0.1, 1e-4) || back.Lowest != -0.2 || !back.Bounded {
		t.Errorf("once the zero is back at 0.1: %+v", back)
	}
}

// While one side has been unvisited for long the threshold stands still, though
// the zero drifts on; nothing is forgotten, so that a short visit cannot make
// the mean of its side; then it follows again.
func TestKeeperFreezes(t *testing.T) {
	const T = 1 << 16
	drift := 0.02 / float64(T)
	var before, after switching.KeeperState
	k := keeper(t, keeping)
	d := switching.NewDecider(switching.Comparator{}, 0, k)
	at := 0
	run := func(ticks int, signal func(tick int) float64) {
		for ; ticks > 0; ticks-- {
			d.Decide(signal(at) + drift*float64(at))
			at++
		}
	}
	both := func(tick int) float64 { return square(tick, 500, 1000) }
	upper := func(int) float64 { return 1 }
	run(10*T, both)
	run(T+2000, upper) // the period, and up to two blocks more
	before = k.State()
	run(10*T, upper)
	after = k.State()
	if before.Travel != after.Travel {
		t.Errorf("frozen, the threshold travelled from %g to %g", before.Travel, after.Travel)
	}
	// Ten time constants and what is over of two periods and blocks.
	if frozen := after.Frozen * float64(at); !within(frozen, 10*T+2000, 1100) {
		t.Errorf("frozen for %.0f ticks, want some %d", frozen, 10*T+2000)
	}
	// A visit of ten ticks near the threshold.
	run(10, func(int) float64 { return after.Travel - drift*float64(at) - 0.01 })
	run(128, upper)
	// Its weight is 10 ticks of e^-1 · T/2, its value 1 off: 0.0004 of travel.
	if got := k.State().Travel; !within(got, after.Travel, 0.001) {
		t.Errorf("a short visit moved the threshold from %g to %g", after.Travel, got)
	}
	run(12*T, both)
	if lag := drift*float64(at) - k.State().Travel; !within(lag, 0.02, 0.0005) {
		t.Errorf("visited again, the lag is %g, want 0.02", lag)
	}
}

// Before the other side was ever seen there is no midpoint to follow.
func TestKeeperWaitsForBothSides(t *testing.T) {
	for _, x := range []float64{1, -1, math.NaN()} {
		s := drive(t, keeping, 5*int(keeping.TimeConstant), func(int) float64 { return x })
		// All but the first time constant of five; in blocks of 64 ticks.
		if s.Travel != 0 || s.Lowest != 0 || s.Highest != 0 || !within(s.Frozen, 0.8, 1e-3) {
			t.Errorf("a signal of %g only: %+v", x, s)
		}
	}
	if s := keeper(t, keeping).State(); s != (switching.KeeperState{}) {
		t.Errorf("before any tick: %+v", s)
	}
}

// Samples that are no finite numbers are ignored, wherever they fall.
func TestKeeperIgnoresLostSamples(t *testing.T) {
	const zero = 0.3
	for _, lost := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		s := drive(t, keeping, 20*int(keeping.TimeConstant), func(tick int) float64 {
			if tick*tick%37 < 17 || tick < 300 {
				return lost
			}
			return square(tick, 300, 1000) + zero
		})
		// exp(-20) of the start is left. (An infinite sample switches the level
		// but for its tick alone: no finite sample is booked under it.)
		if !within(s.Travel, zero, 1e-6) || s.Frozen != 0 {
			t.Errorf("with %g every other tick: %+v, want a travel of %g", lost, s, zero)
		}
	}
}

func TestKeeperDoesNotAllocate(t *testing.T) {
	d := switching.NewDecider(switching.Comparator{}, 3, keeper(t, keeping))
	tick := 0
	if a := testing.AllocsPerRun(10, func() {
		for range 1000 {
			d.Decide(square(tick, 500, 1000))
			tick++
		}
	}); a != 0 {
		t.Errorf("%v allocations per 1,000 ticks", a)
	}
}

func TestKeeperConfigErrors(t *testing.T) {
	for _, c := range []struct {
		change func(*switching.KeeperConfig)
		want   string
	}{
		{func(c *switching.KeeperConfig) { c.ExpectedMidpoint = math.NaN() }, "expected midpoint NaN m"},
		{func(c *switching.KeeperConfig) { c.ExpectedMidpoint = math.Inf(1) }, "expected midpoint +Inf m"},
		{func(c *switching.KeeperConfig) { c.TimeConstant = 1023 }, "time constant of 1023 ticks, want 1024 to 1e+18"},
		{func(c *switching.KeeperConfig) { c.TimeConstant = math.NaN() }, "time constant of NaN ticks"},
		{func(c *switching.KeeperConfig) { c.TimeConstant = math.Inf(1) }, "time constant of +Inf ticks"},
		{func(c *switching.KeeperConfig) { c.Bound = 0 }, "travel of the threshold 0 m"},
		{func(c *switching.KeeperConfig) { c.Bound = math.NaN() }, "travel of the threshold NaN m"},
		{func(c *switching.KeeperConfig) { c.Bound = math.Inf(1) }, "travel of the threshold +Inf m"},
		{func(c *switching.KeeperConfig) { c.Unvisited = 63 }, "frozen after 63 ticks"},
		{func(c *switching.KeeperConfig) { c.Unvisited = 5 * c.TimeConstant }, "want 64 ticks to 4 time constants, 262144 ticks"},
		{func(c *switching.KeeperConfig) { c.Unvisited = math.NaN() }, "frozen after NaN ticks"},
	} {
		config := keeping
		c.change(&config)
		if _, err := switching.NewKeeper(config); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
	}
}

// The midpoint against the integral over the density of the cut-off wells, by
// gonum's Gauss-Legendre rule.
func TestIdealMidpoint(t *testing.T) {
	for _, sigma := range []float64{1, 2.25e-10} {
		for _, c := range []struct{ x1, x0 float64 }{{3, 0.2}, {2.8, -0.5}, {1, 0.3}, {0.5, -0.9}, {3, 0}} {
			mean := func(low, high, centre float64) float64 {
				density := func(x float64) float64 { return math.Exp(-(x - centre) * (x - centre) / 2) }
				return quad.Fixed(func(x float64) float64 { return x * density(x) }, low, high, 100, nil, 0) /
					quad.Fixed(density, low, high, 100, nil, 0)
			}
			want := (mean(c.x0-12, c.x0, -c.x1) + mean(c.x0, c.x0+12, c.x1)) / 2 * sigma
			// The rule's and the functions' rounding.
			if got := switching.IdealMidpoint(c.x1*sigma, c.x0*sigma, sigma); !within(got, want, 1e-13*sigma) {
				t.Errorf("x1 %g, x0 %g: %v, want %v", c.x1, c.x0, got, want)
			}
		}
	}
}

// The proposal for the bench of the demo (6.5 kHz, Q 35, wells 2.83 σ from
// their midpoint) by hand: 1/(Q·ω0) is 0.70 µs, so that a scatter of
// 0.01/(2·2.83) σ takes 0.22 s; thirty dwells of 5 ms are less, of 27 ms more.
func TestProposeKeeper(t *testing.T) {
	const sigma = 2.25e-10
	w := switching.Wells{
		Rate: 1e6, Omega0: 2 * math.Pi * 6500, Quality: 35,
		Sigma: sigma, HalfDistance: math.Sqrt(8) * sigma, Dwell: 0.005,
	}
	for _, c := range []struct{ dwell, want, tol float64 }{
		{0.005, 0.2239e6, 100}, // 8/(0.01²/4 · Q·ω0), to the digits shown
		{0.027, 0.81e6, 1e-3},
	} {
		w.Dwell = c.dwell
		got := switching.ProposeKeeper(w)
		if !within(got.TimeConstant, c.want, c.tol) || got.Unvisited != got.TimeConstant || got.Bound != w.HalfDistance || got.ExpectedMidpoint != 0 {
			t.Errorf("dwell times of %g s: %+v, want a time constant of %g ticks", c.dwell, got, c.want)
		}
		keeper(t, got)
	}
	w.Quality, w.Dwell = 5000, 0.005
	if got := switching.ProposeKeeper(w).TimeConstant; !within(got, 100*5000/w.Omega0*1e6, 1) {
		t.Errorf("Q 5000: time constant of %g ticks, want a hundred times Q/ω0", got)
	}
	for _, dwell := range []float64{math.NaN(), math.Inf(1)} {
		w.Dwell = dwell
		if _, err := switching.NewKeeper(switching.ProposeKeeper(w)); err == nil {
			t.Errorf("a keeper for dwell times of %g s has no error", dwell)
		}
	}
}

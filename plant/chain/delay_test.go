package chain

import (
	"math"
	"slices"
	"testing"

	"brinkwell/controller/trace"
	"brinkwell/plant/variate"
)

func newDelay(t *testing.T, c DelayConfig) *Delay {
	t.Helper()
	d, err := NewDelay(c, variate.NewNormal(1, 0))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// latencies sends levels far apart and returns how long each took, s.
func latencies(t *testing.T, c DelayConfig, n int) []float64 {
	t.Helper()
	d := newDelay(t, c)
	out := make([]float64, n)
	for i := range out {
		tick := int64(i) * 100000
		d.Push(tick, trace.Level(i%2))
		cmd := d.Pop()
		if cmd.Offset < 0 || cmd.Offset >= 1/c.Rate || cmd.Decided != tick {
			t.Fatalf("command %+v of tick %d", cmd, tick)
		}
		out[i] = float64(cmd.Tick-tick)/c.Rate + cmd.Offset
	}
	return out
}

// Latencies are distributed as their shape says, cut at 0, by the largest
// distance from its cumulative distribution (Kolmogorov and Smirnov; 1.95/√n is
// the 0.1 % point), and their mean is Mean's.
func TestJitter(t *testing.T) {
	phi := func(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }
	cdf := map[Shape]func(z float64) float64{ // of (latency - mean)/jitter, not cut
		Uniform:     func(z float64) float64 { return min(max((z+math.Sqrt(3))/(2*math.Sqrt(3)), 0), 1) },
		Normal:      phi,
		Exponential: func(z float64) float64 { return max(0, -math.Expm1(-(z + 1))) },
	}
	for shape, f := range cdf {
		for _, latency := range []float64{10e-6, 1e-6, 0} {
			c := DelayConfig{Rate: 1e6, Latency: latency, Jitter: 2e-6, Shape: shape}
			const n = 40000
			x := latencies(t, c, n)
			slices.Sort(x)
			low := f(-latency / c.Jitter)
			worst, mean := 0.0, 0.0
			for i, v := range x {
				p := (f((v-latency)/c.Jitter) - low) / (1 - low)
				worst = max(worst, math.Abs(p-float64(i)/n), math.Abs(p-float64(i+1)/n))
				mean += v / n
			}
			if !(worst < 1.95/math.Sqrt(n)) {
				t.Errorf("%s about %v s: %v from its distribution", shape, latency, worst)
			}
			if !(math.Abs(mean-c.Mean()) < 3.5*c.Jitter/math.Sqrt(n)) {
				t.Errorf("%s about %v s: mean %v, want %v", shape, latency, mean, c.Mean())
			}
		}
	}
}

// However the latencies scatter, levels leave in the order in which they came,
// each at or after the one before, and none is lost when more are on their way
// than the line was made for.
func TestOrder(t *testing.T) {
	d := newDelay(t, DelayConfig{Rate: 1e6, Latency: 3e-6, Jitter: 50e-6, Shape: Exponential})
	const n = 20000
	popped := int64(0)
	var last Command
	pop := func() {
		c := d.Pop()
		if c.Decided != popped {
			t.Fatalf("level %d leaves, want %d", c.Decided, popped)
		}
		if c.Tick < last.Tick || c.Tick == last.Tick && c.Offset < last.Offset || c.Tick < c.Decided {
			t.Fatalf("%+v leaves after %+v", c, last)
		}
		last = c
		popped++
	}
	for tick := range int64(n) {
		d.Push(tick, trace.Level(tick%2))
		for tick > n/2 && d.Due() <= tick { // nothing leaves at first: the ring must grow
			pop()
		}
	}
	for d.Due() != Never {
		pop()
	}
	if popped != n {
		t.Errorf("%d levels left, want %d", popped, n)
	}
}

func TestDelayRefuses(t *testing.T) {
	for _, c := range []DelayConfig{
		{Rate: 0, Latency: 1},
		{Rate: 1e6, Latency: -1e-9},
		{Rate: 1e6, Latency: 17},
		{Rate: 1e6, Jitter: 1, Shape: Normal},
		{Rate: 1e6, Jitter: 1e-6, Shape: "round"},
		{Rate: 1e6, Jitter: math.NaN(), Shape: Normal},
	} {
		if _, err := NewDelay(c, variate.NewNormal(1, 0)); err == nil {
			t.Errorf("%+v is accepted", c)
		}
	}
}

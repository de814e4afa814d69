package plant_test

import (
	"fmt"
	"math"
	"testing"

	"brinkwell/controller/trace"
	"brinkwell/plant"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// moved is how far, and how fast in units of ω₀, an oscillator at rest has
// come t (in 1/ω₀) after its centre moved by 1: the step response of a damped
// oscillator, as in any textbook of mechanics.
func moved(quality, t float64) (x, v float64) {
	if t <= 0 {
		return 0, 0
	}
	g := 1 / (2 * quality)
	switch {
	case g < 1:
		w := math.Sqrt(1 - g*g)
		s, c := math.Sincos(w * t)
		e := math.Exp(-g * t)
		return 1 - e*(c+g/w*s), e * s / w
	case g > 1:
		w := math.Sqrt(g*g - 1)
		slow, fast := math.Exp(-t/(g+w)), math.Exp(-(g+w)*t) // 1/(g+w) = g-w
		return 1 - ((g+w)*slow-(g-w)*fast)/(2*w), (slow - fast) / (2 * w)
	default:
		e := math.Exp(-t)
		return 1 - e*(1+t), t * e
	}
}

// toggles are the ticks at which the level changes: quietly, then at every
// tick for longer than the longest latency, then quietly again.
func toggles() map[int64]bool {
	at := map[int64]bool{0: true, 3: true, 200: true, 201: true, 203: true, 400: true}
	for tick := int64(600); tick < 1800; tick++ {
		at[tick] = true
	}
	at[2500], at[2504] = true, true
	return at
}

// Without noise the motion is the sum of the responses to the centre's moves,
// each exactly the latency after the sample that decided it.
func TestActuationsComeTheLatencyLater(t *testing.T) {
	t.Parallel()
	for _, c := range []struct {
		latency float64 // ticks
		whole   int64
		offset  float64 // ticks
	}{
		{0, 0, 0},
		{0.001, 0, 0.001},
		{0.3, 0, 0.3},
		{0.999, 0, 0.999},
		{1, 1, 0},
		{1 - 1e-11, 1, 0}, // within rounding of a tick
		{1 + 1e-11, 1, 0},
		{2.5, 2, 0.5},
		{3, 3, 0},
		{1000, 1000, 0},
		{1000.25, 1000, 0.25},
	} {
		for _, quality := range []float64{0.02, 0.5, 35} {
			t.Run(fmt.Sprintf("latency=%g/Q=%g", c.latency, quality), func(t *testing.T) {
				checkLatency(t, quality, c.latency, c.whole, c.offset)
			})
		}
	}
}

func checkLatency(t *testing.T, quality, latency float64, whole int64, offset float64) {
	const ticks = 4000
	c := config()
	c.Oscillator = paddle(quality)
	c.Oscillator.KT = 0 // starts at rest in the lower well
	c.Sensor.Density = 0
	c.Latency = latency / rate
	p := newPlant(t, c)
	x1 := c.Centres[trace.Upper]
	perTick := c.Oscillator.Omega0 / rate

	var decided []int64
	at := toggles()
	// The state at a time in ticks, in x1 and ω₀·x1.
	state := func(time float64) (x, v float64) {
		x = -1
		shift := 2.0
		for _, d := range decided {
			dx, dv := moved(quality, (time-float64(d)-float64(whole)-offset)*perTick)
			x, v, shift = x+shift*dx, v+shift*dv, -shift
		}
		return x, v
	}
	// Responses of order 2 to up to 1,200 toggles, each at a time known to
	// 1e-11 ticks, and the roundings of 4,000 ticks.
	const tol = 2e-12
	var events []trace.Event
	level := p.Level()
	if level != trace.Lower {
		t.Fatal("without thermal motion the plant does not start in the lower well")
	}
	for tick := range int64(ticks) {
		var s trace.Sample
		if err := p.Sense(tick, &s); err != nil {
			t.Fatal(err)
		}
		if tick%97 == 0 {
			x, v := state(float64(tick))
			if !(math.Abs(s.Position/x1-x) < tol && math.Abs(s.Velocity/x1/c.Oscillator.Omega0-v) < tol) {
				t.Fatalf("tick %d: position off by %.2g x1, velocity by %.2g ω₀·x1, want < %g",
					tick, s.Position/x1-x, s.Velocity/x1/c.Oscillator.Omega0-v, tol)
			}
		}
		if at[tick] {
			level = 1 - level
			decided = append(decided, tick)
			if err := p.Actuate(tick, level); err != nil {
				t.Fatal(err)
			}
		}
		if tick%64 == 0 {
			events = p.Acted(events)
		}
	}
	events = p.Acted(events)
	if len(events) != len(decided) {
		t.Fatalf("%d events of %d decisions", len(events), len(decided))
	}
	for i, e := range events {
		level := trace.Upper
		if i%2 == 1 {
			level = trace.Lower
		}
		if e.Decided != decided[i] || e.Tick != decided[i]+whole || e.Level != level || !(math.Abs(e.Offset*rate-offset) < 1e-11) {
			t.Fatalf("event %d is %+v, want %v decided at %d, acting at %d and %g ticks", i, e, level, decided[i], decided[i]+whole, offset)
		}
		if i%7 != 0 {
			continue
		}
		if x, _ := state(float64(e.Tick) + e.Offset*rate); !(math.Abs(e.Position/x1-x) < tol) {
			t.Fatalf("event %d: position off by %.2g x1, want < %g", i, e.Position/x1-x, tol)
		}
	}
}

// The level in force changes at the actuation, not at the decision.
func TestLevelIsThatInForce(t *testing.T) {
	c := config()
	c.Oscillator.KT, c.Sensor.Density = 0, 0
	p := newPlant(t, c) // 2.5 ticks
	var s trace.Sample
	for tick := range int64(5) {
		_ = p.Sense(tick, &s)
		want := trace.Lower
		if tick > 2 { // sensing tick 3 passes the actuation
			want = trace.Upper
		}
		if got := p.Level(); got != want {
			t.Errorf("level after sensing tick %d is %v, want %v", tick, got, want)
		}
		if tick == 0 {
			_ = p.Actuate(tick, trace.Upper)
		}
	}
	if again := append(p.Acted(nil), p.Acted(nil)...); len(again) != 1 {
		t.Errorf("two calls of Acted gave %d events, want the one once", len(again))
	}
}

// Two levels commanded in one tick: the last holds, and the plant goes on.
func TestLastCommandOfATickHolds(t *testing.T) {
	p, err := plant.New(plant.Config{
		Oscillator: motion.Oscillator{Omega0: 1, Quality: 10, Stiffness: 1, KT: 1},
		Rate:       20,
		Centres:    [trace.Levels]float64{-3, 3},
		Latency:    0.1,
		Seed:       1,
	})
	if err != nil {
		t.Fatal(err)
	}
	var s trace.Sample
	for tick := range int64(20) {
		if err := p.Sense(tick, &s); err != nil {
			t.Fatal(err)
		}
		if tick == 5 || tick == 10 {
			for _, level := range []trace.Level{trace.Lower, trace.Upper, 1 - trace.Level(tick/10)} {
				if err := p.Actuate(tick, level); err != nil {
					t.Fatal(err)
				}
			}
		}
	}
	events := p.Acted(nil)
	if len(events) != 2 || events[0].Level != trace.Upper || events[1].Level != trace.Lower {
		t.Errorf("events %+v, want upper decided at tick 5 and lower at tick 10", events)
	}
}

// An event's measured position lies on the chord between the samples around
// it, and its work is that of a parabola whose centre jumps,
// -2·k·x1·s·(x - x0).
func TestEventMeasuredAndWork(t *testing.T) {
	const x1, x0, rate = 3.0, 0.4, 20.0
	p, err := plant.New(plant.Config{
		Oscillator: motion.Oscillator{Omega0: 1, Quality: 10, Stiffness: 1.5, KT: 1},
		Rate:       rate,
		Centres:    [trace.Levels]float64{-x1, x1},
		Threshold:  x0,
		Latency:    1.3 / rate,
		Sensor:     chain.White(0.5, rate),
		Seed:       3,
	})
	if err != nil {
		t.Fatal(err)
	}
	samples := make([]trace.Sample, 200)
	for i := range samples {
		if err := p.Sense(int64(i), &samples[i]); err != nil {
			t.Fatal(err)
		}
		if i%20 == 10 {
			if err := p.Actuate(int64(i), trace.Level(i/20%2)); err != nil {
				t.Fatal(err)
			}
		}
	}
	level := trace.Level(1) // events alternate from the lower level on; the first may change nothing
	for _, e := range p.Acted(nil) {
		before, after := samples[e.Tick].Measured, samples[e.Tick+1].Measured
		if want := before + 0.3*(after-before); !(math.Abs(e.Measured-want) < 1e-12) {
			t.Errorf("measured %v between %v and %v, want %v", e.Measured, before, after, want)
		}
		want := -2 * 1.5 * x1 * e.Level.Sign() * (e.Position - x0)
		if e.Tick > 20 && !(math.Abs(e.Work-want) < 1e-12) {
			t.Errorf("work %v at %v to the %v level, want %v", e.Work, e.Position, e.Level, want)
		}
		level = e.Level
	}
	if level != trace.Upper {
		t.Errorf("the last level is %v, want upper", level)
	}
}

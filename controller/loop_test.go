package controller_test

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"

	"brinkwell/controller"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
)

var errFault = errors.New("a fault")

// A script is a sensor and an actuator whose positions are known beforehand
// and whose actuations are known late ticks after they were commanded. From
// its failAt-th call on it fails, permanently, where failAt is not negative.
type script struct {
	late   int64
	failAt int
	level  trace.Level // at the start

	calls    int
	tripped  bool
	tick     int64 // of the failing call
	actuator bool  // whether it was the actuator's
	sensed   []int64
	commands []trace.Event
	told     int
}

// position toggles after runs of ticks of many lengths.
func position(tick int64) float64 {
	if tick*tick%37 < 17 {
		return -1
	}
	return 1
}

func (s *script) fails(tick int64, actuator bool) error {
	s.calls++
	if s.failAt < 0 || s.calls <= s.failAt {
		return nil
	}
	s.tripped, s.tick, s.actuator = true, tick, actuator
	return errFault
}

func (s *script) Sense(tick int64, sample *trace.Sample) error {
	if err := s.fails(tick, false); err != nil {
		return err
	}
	s.sensed = append(s.sensed, tick)
	*sample = trace.Sample{Measured: position(tick), Position: position(tick), Velocity: float64(tick)}
	return nil
}

func (s *script) Actuate(tick int64, level trace.Level) error {
	if err := s.fails(tick, true); err != nil {
		return err
	}
	s.commands = append(s.commands, trace.Event{Decided: tick, Tick: tick + s.late, Level: level, Position: position(tick)})
	return nil
}

func (s *script) Acted(dst []trace.Event) []trace.Event {
	last := int64(0)
	if len(s.sensed) > 0 {
		last = s.sensed[len(s.sensed)-1]
	}
	for s.told < len(s.commands) && s.commands[s.told].Tick < last {
		dst = append(dst, s.commands[s.told])
		s.told++
	}
	return dst
}

func (s *script) Level() trace.Level { return s.level }

// A copier keeps what goes to a sink, and checks what every block promises.
type copier struct {
	samples []trace.Sample
	events  []trace.Event
	next    int64
	force   trace.Level
	blocks  int
	after   func(blocks int) error
}

func (c *copier) Take(b *trace.Block) error {
	switch {
	case b.Start != c.next:
		return fmt.Errorf("a block starts at tick %d, want %d", b.Start, c.next)
	case b.Initial != c.force:
		return fmt.Errorf("the block of tick %d starts with the %v level, want %v", b.Start, b.Initial, c.force)
	case !b.Truth:
		return errors.New("a block does not know the truth")
	}
	c.next += int64(len(b.Samples))
	for _, e := range b.Events {
		// Between the last tick of the block before and the last of this one.
		if e.Tick < b.Start-1 || e.Tick >= c.next {
			return fmt.Errorf("an actuation at tick %d in the block of ticks %d to %d", e.Tick, b.Start, c.next-1)
		}
		c.force = e.Level
	}
	c.samples = append(c.samples, b.Samples...)
	c.events = append(c.events, b.Events...)
	c.blocks++
	if c.after != nil {
		return c.after(c.blocks)
	}
	return nil
}

func scripted(s *script, first int64) *controller.Loop {
	return controller.New(controller.Config{Sensor: s, Actuator: s, Truth: true, First: first})
}

// Every tick reaches every sink once and in order, also over runs that are no
// whole number of blocks; what was decided is what a comparator of its own
// decides, and every change of it is commanded once.
func TestSinksGetEveryTick(t *testing.T) {
	for _, late := range []int64{0, 1, 3, 2000} {
		for _, first := range []int64{0, -1500, 12345} {
			s := &script{late: late, failAt: -1}
			l := scripted(s, first)
			a, b := &copier{next: first}, &copier{next: first}
			total := int64(0)
			for _, n := range []int64{1, 1023, 1024, 1025, 0, 1, 3000, 7} {
				done, err := l.Run(context.Background(), n, a, b)
				if done != n || err != nil {
					t.Fatalf("Run of %d ticks: %d, %v", n, done, err)
				}
				total += n
			}
			if int64(len(a.samples)) != total || !slices.Equal(a.samples, b.samples) || !slices.Equal(a.events, b.events) {
				t.Fatalf("of %d ticks the sinks have %d and %d", total, len(a.samples), len(b.samples))
			}
			var c switching.Comparator
			var want []trace.Event
			for i, got := range a.samples {
				tick := first + int64(i)
				before := c.Level
				level := c.Decide(position(tick))
				if got != (trace.Sample{Measured: position(tick), Position: position(tick), Velocity: float64(tick), Level: level}) {
					t.Fatalf("tick %d is %+v", tick, got)
				}
				if level != before {
					want = append(want, trace.Event{Decided: tick, Tick: tick + late, Level: level, Position: position(tick)})
				}
			}
			if !slices.Equal(s.commands, want) {
				t.Fatalf("%d commands, want %d, in order", len(s.commands), len(want))
			}
			if late < 10 && len(a.events) < 100 || !slices.Equal(a.events, want[:len(a.events)]) {
				t.Fatalf("late %d: the sinks have %d events of %d", late, len(a.events), len(want))
			}
		}
	}
}

// The same on a simulated plant with noise, band and latency.
func TestBlocksOfAPlant(t *testing.T) {
	t.Parallel()
	for _, latency := range []float64{0, 0.25, 1, 2.5} {
		b := bench{quality: 10, barrier: 1, dt: 0.05, latency: latency, band: 0.02, noise: 0.1, seed: 3}
		l := b.loop(t)
		c := &copier{}
		initial := startLevel(t, b)
		c.force = initial
		const ticks = 100_000
		if _, err := l.Run(context.Background(), ticks, c); err != nil {
			t.Fatal(err)
		}
		comparator := switching.Comparator{HalfBand: b.band, Level: initial}
		changes := 0
		whole := int64(latency)
		for tick, s := range c.samples {
			before := comparator.Level
			if comparator.Decide(s.Measured) != s.Level {
				t.Fatalf("tick %d: %v decided from %g", tick, s.Level, s.Measured)
			}
			if s.Level == before {
				continue
			}
			if changes == len(c.events) {
				if int64(tick) < ticks-1-whole {
					t.Fatalf("what tick %d decided never acted", tick)
				}
				break
			}
			e := c.events[changes]
			offset := (latency - float64(whole)) * b.dt
			// Roundings of the latency in ticks.
			if e.Decided != int64(tick) || e.Tick != int64(tick)+whole || e.Level != s.Level || !(e.Offset-offset < 1e-12 && offset-e.Offset < 1e-12) {
				t.Fatalf("event %d is %+v, want %v decided at tick %d", changes, e, s.Level, tick)
			}
			changes++
		}
		if changes != len(c.events) || changes < 100 {
			t.Errorf("%d events of %d changes", len(c.events), changes)
		}
	}
}

// startLevel is the level that a bench of that seed starts with.
func startLevel(t *testing.T, b bench) trace.Level {
	var level trace.Level
	see := sinkFunc(func(block *trace.Block) error {
		level = block.Initial
		return nil
	})
	if _, err := b.loop(t).Run(context.Background(), 1, see); err != nil {
		t.Fatal(err)
	}
	return level
}

type sinkFunc func(b *trace.Block) error

func (f sinkFunc) Take(b *trace.Block) error { return f(b) }

// The loop starts from the level in force, whatever the comparator held: within
// the band there is nothing to command.
func TestLoopStartsFromTheLevelInForce(t *testing.T) {
	for _, level := range []trace.Level{trace.Lower, trace.Upper} {
		s := &script{failAt: -1, level: level}
		held := switching.Comparator{HalfBand: 2, Level: 1 - level}
		c := &copier{force: level}
		l := controller.New(controller.Config{Sensor: s, Actuator: s, Comparator: held, Truth: true})
		if _, err := l.Run(context.Background(), 100, c); err != nil {
			t.Fatal(err)
		}
		if len(s.commands) != 0 || c.samples[0].Level != level {
			t.Errorf("%d commands, and the first sample has the %v level; want none and %v", len(s.commands), c.samples[0].Level, level)
		}
	}
}

// A cancelled run ends at the end of a block, and can be taken up.
func TestCancelEndsAtABlock(t *testing.T) {
	s := &script{failAt: -1}
	l := scripted(s, 0)
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	c := &copier{after: func(blocks int) error {
		if blocks == 3 {
			cancel()
		}
		return nil
	}}
	done, err := l.Run(ctx, 10_000, c)
	if done != 3*blockTicks || !errors.Is(err, context.Canceled) || len(c.samples) != 3*blockTicks {
		t.Fatalf("cancelled in its third block: %d ticks, %v, %d samples", done, err, len(c.samples))
	}
	if done, err = l.Run(ctx, 10_000, c); done != 0 || !errors.Is(err, context.Canceled) {
		t.Errorf("a run under a cancelled context: %d ticks, %v", done, err)
	}
	if done, err = l.Run(context.Background(), 500, c); done != 500 || err != nil {
		t.Errorf("a run after a cancelled one: %d ticks, %v", done, err)
	}
}

func TestSinkThatFails(t *testing.T) {
	s := &script{failAt: -1}
	l := scripted(s, 0)
	c := &copier{after: func(blocks int) error {
		if blocks == 2 {
			return errFault
		}
		return nil
	}}
	if done, err := l.Run(context.Background(), 10_000, c); done != 2*blockTicks || !errors.Is(err, errFault) {
		t.Errorf("a sink that fails at its second block: %d ticks, %v", done, err)
	}
}

// Whichever call of the sensor or the actuator fails: the error names the
// tick, the ticks before still reach the sinks, and the loop does not go on.
func TestFaults(t *testing.T) {
	const ticks = 1100 // more than a block
	n, actuator := 0, 0
	for ; ; n++ {
		s := &script{failAt: n, late: 2}
		l := scripted(s, 100)
		c := &copier{next: 100}
		done, err := l.Run(context.Background(), ticks, c)
		if !s.tripped {
			break // no call left to fail
		}
		tick := s.tick
		if s.actuator {
			actuator++
		}
		if !errors.Is(err, errFault) || !strings.Contains(err.Error(), fmt.Sprintf("tick %d:", tick)) {
			t.Fatalf("call %d failed at tick %d: error %v", n, tick, err)
		}
		if done != tick-100 || int64(len(c.samples)) != done {
			t.Fatalf("call %d failed at tick %d: %d ticks done, %d in the sink", n, tick, done, len(c.samples))
		}
		if again, err := l.Run(context.Background(), ticks, c); again != 0 || !errors.Is(err, errFault) {
			t.Fatalf("call %d failed for good, and a new run did %d ticks: %v", n, again, err)
		}
	}
	if n < ticks || actuator < 100 {
		t.Errorf("%d calls failed, of them %d of the actuator: too few for %d ticks", n, actuator, ticks)
	}
}

// A level whose command failed is not in force: a loop that is run again
// commands it, instead of taking the wrong side for the right one.
func TestFailedCommandIsGivenAgain(t *testing.T) {
	for n := 0; n < 400; n++ {
		s := &script{failAt: n}
		l := scripted(s, 0)
		_, err := l.Run(context.Background(), 300)
		if err == nil {
			break
		}
		s.failAt = -1 // mended
		if _, err := l.Run(context.Background(), 50); err != nil {
			t.Fatal(err)
		}
		level := trace.Lower
		for i, e := range s.commands {
			if e.Level == level {
				t.Fatalf("call %d failed: command %d, at tick %d, repeats the %v level: one is lost", n, i, e.Decided, e.Level)
			}
			level = e.Level
		}
		want := trace.Lower
		if position(s.sensed[len(s.sensed)-1]) > 0 {
			want = trace.Upper
		}
		if level != want {
			t.Fatalf("call %d failed: the last command is the %v level, the resonator on the other side", n, level)
		}
	}
}

func TestNewWithoutDevicesPanics(t *testing.T) {
	for _, c := range []controller.Config{
		{},
		{Sensor: &script{}},
		{Actuator: &script{}},
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("New of a sensor %t, an actuator %t did not panic", c.Sensor != nil, c.Actuator != nil)
				}
			}()
			controller.New(c)
		}()
	}
}

// Once it runs, a loop on a plant allocates nothing, chatter included, nor does
// keeping the threshold.
func TestLoopDoesNotAllocate(t *testing.T) {
	chattering := bench{quality: 10, barrier: 0.5, dt: 0.05, noise: 0.3, seed: 1}
	late := chattering
	late.latency = 2.5
	keeper, err := switching.NewKeeper(switching.KeeperConfig{TimeConstant: 1e5, Bound: 1, Unvisited: 1e5})
	if err != nil {
		t.Fatal(err)
	}
	p := chattering.plant(t)
	kept := controller.New(controller.Config{Sensor: p, Actuator: p, Truth: true, HoldOff: 2, Keeper: keeper})
	for name, l := range map[string]*controller.Loop{"without latency": chattering.loop(t), "with latency": late.loop(t), "kept": kept} {
		events := 0
		sinks := []trace.Sink{sinkFunc(func(b *trace.Block) error {
			events += len(b.Events)
			return nil
		})}
		ctx := context.Background()
		if a := testing.AllocsPerRun(50, func() {
			if _, err := l.Run(ctx, 4*blockTicks, sinks...); err != nil {
				t.Fatal(err)
			}
		}); a != 0 {
			t.Errorf("%s: %v allocations per four blocks, want 0", name, a)
		}
		if events < 2000 {
			t.Errorf("%s: only %d events were tried", name, events)
		}
	}
}

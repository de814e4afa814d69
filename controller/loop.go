// Package controller closes the fixed-rate loop: a Sensor is read each tick,
// a comparator decides, a changed level goes to an Actuator, and blocks of
// what happened go to sinks.
//
// It knows only these interfaces; what stands behind them, a simulated plant
// or a board, it may not know.
package controller

import (
	"context"
	"fmt"

	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
)

// A Sensor measures the position.
type Sensor interface {
	// Sense fills in what is known of a tick: Measured, and Position and
	// Velocity where the sensor is a simulation that knows them. The loop
	// calls it once a tick, in order.
	Sense(tick int64, s *trace.Sample) error
}

// An Actuator applies levels.
type Actuator interface {
	// Actuate commands a level that the sample of a tick decided.
	Actuate(tick int64, level trace.Level) error
	// Acted appends to dst the actuations that became known since its last
	// call, oldest first.
	Acted(dst []trace.Event) []trace.Event
	// Level returns the level in force at the start.
	Level() trace.Level
}

// A Config says what a Loop closes on.
type Config struct {
	Sensor     Sensor
	Actuator   Actuator
	Comparator switching.Comparator // its Level is set from the Actuator's
	HoldOff    int64                // ticks between two changes of level, at least; see switching.NewDecider
	Keeper     *switching.Keeper    // of the threshold; nil for none
	Truth      bool                 // whether the Sensor knows true positions
	First      int64                // number of the first tick
}

// blockTicks is the length of a block: 1,024 samples of 32 bytes stay in the
// second-level cache between the loop and the sinks.
const blockTicks = 1024

// A Loop runs in virtual time, as fast as it goes: blocks go to the sinks
// synchronously and nothing is dropped. It must be made by New and must not
// be used by two goroutines at once. It does not allocate once it runs.
type Loop struct {
	sensor     Sensor
	actuator   Actuator
	comparator switching.Comparator // its Level is the one last commanded
	decider    *switching.Decider   // in the comparator's place; nil where it alone decides
	keeper     *switching.Keeper
	tick       int64
	force      trace.Level // level in force after the events seen so far
	block      trace.Block
}

// New makes a Loop. It panics if c lacks a Sensor or an Actuator, or has a
// negative HoldOff.
func New(c Config) *Loop {
	if c.Sensor == nil || c.Actuator == nil {
		panic("controller: a loop needs a sensor and an actuator")
	}
	l := &Loop{
		sensor:     c.Sensor,
		actuator:   c.Actuator,
		comparator: c.Comparator,
		tick:       c.First,
		force:      c.Actuator.Level(),
	}
	l.comparator.Level = l.force
	if c.HoldOff != 0 || c.Keeper != nil {
		l.keeper = c.Keeper
		l.decider = switching.NewDecider(l.comparator, c.HoldOff, c.Keeper)
	}
	l.block = trace.Block{
		Truth:   c.Truth,
		Samples: make([]trace.Sample, blockTicks),
		Events:  make([]trace.Event, 0, blockTicks+1),
	}
	return l
}

// Threshold tells how the threshold travelled so far, warm-up included: not
// at all without a Keeper.
func (l *Loop) Threshold() switching.KeeperState {
	if l.keeper == nil {
		return switching.KeeperState{}
	}
	return l.keeper.State()
}

// Run runs the loop for a number of ticks and hands each block to the sinks.
// When ctx ends it stops at the end of a block and returns ctx's error with
// the number of ticks done. When the sensor or the actuator fails, the ticks
// before the failure still go to the sinks, and a further Run begins with the
// tick that failed.
func (l *Loop) Run(ctx context.Context, ticks int64, sinks ...trace.Sink) (done int64, err error) {
	for done < ticks && err == nil {
		if err := ctx.Err(); err != nil {
			return done, err
		}
		var n int
		n, err = l.run(l.block.Samples[:min(ticks-done, blockTicks)])
		done += int64(n)
		if failed := l.deliver(n, sinks); failed != nil && err == nil {
			err = failed
		}
	}
	return done, err
}

// deliver hands the last n ticks to the sinks.
func (l *Loop) deliver(n int, sinks []trace.Sink) error {
	if n == 0 {
		return nil
	}
	b := &l.block
	b.Start, b.Samples, b.Initial = l.tick-int64(n), b.Samples[:n], l.force
	b.Events = l.actuator.Acted(b.Events[:0])
	if k := len(b.Events); k > 0 {
		l.force = b.Events[k-1].Level
	}
	for _, s := range sinks {
		if err := s.Take(b); err != nil {
			return err
		}
	}
	return nil
}

// run fills samples, one a tick, and returns how many it filled.
func (l *Loop) run(samples []trace.Sample) (n int, err error) {
	if l.decider == nil {
		n, err = l.compare(samples)
	} else {
		n, err = l.decide(samples)
	}
	l.tick += int64(n)
	if err != nil {
		err = fmt.Errorf("tick %d: %w", l.tick, err)
	}
	return n, err
}

// compare is run with the comparator alone. That it is not decide, with a
// branch, saves 2 % of the time of a tick.
func (l *Loop) compare(samples []trace.Sample) (n int, err error) {
	sensor, c := l.sensor, l.comparator
	tick, level := l.tick, c.Level
	for i := range samples {
		s := &samples[i]
		if err = sensor.Sense(tick, s); err != nil {
			break
		}
		if s.Level = c.Decide(s.Measured); s.Level != level {
			if err = l.actuator.Actuate(tick, s.Level); err != nil {
				break
			}
			level = s.Level
		}
		tick++
	}
	l.comparator.Level = level // where a command failed: a later Run decides it anew
	return int(tick - l.tick), err
}

// decide is run with a hold-off or a Keeper.
func (l *Loop) decide(samples []trace.Sample) (n int, err error) {
	sensor, d := l.sensor, l.decider
	tick, level := l.tick, l.comparator.Level
	for i := range samples {
		s := &samples[i]
		if err = sensor.Sense(tick, s); err != nil {
			break
		}
		if s.Level = d.Decide(s.Measured); s.Level != level {
			if err = l.actuator.Actuate(tick, s.Level); err != nil {
				d.Restore(level) // a later Run decides it anew
				break
			}
			level = s.Level
		}
		tick++
	}
	l.comparator.Level = level
	return int(tick - l.tick), err
}

package controller_test

import (
	"context"
	"slices"
	"testing"

	"brinkwell/controller"
	"brinkwell/controller/switching"
	"brinkwell/controller/trace"
)

// A command that fails begins no hold-off: it is given again at the same tick,
// and all goes on as without the fault. No two commands are closer than it.
func TestFailedCommandBeginsNoHoldOff(t *testing.T) {
	const holdOff = 7
	tried := 0
	for n := 0; n < 400; n++ {
		s := &script{failAt: n}
		l := controller.New(controller.Config{Sensor: s, Actuator: s, HoldOff: holdOff, Truth: true})
		if _, err := l.Run(context.Background(), 300); err == nil {
			break
		}
		s.failAt = -1 // mended
		if _, err := l.Run(context.Background(), 300); err != nil {
			t.Fatal(err)
		}
		if s.actuator {
			tried++
			if !slices.ContainsFunc(s.commands, func(e trace.Event) bool { return e.Decided == s.tick }) {
				t.Fatalf("the command of tick %d failed and was not given again", s.tick)
			}
		}
		whole := &script{failAt: -1}
		want := controller.New(controller.Config{Sensor: whole, Actuator: whole, HoldOff: holdOff, Truth: true})
		if _, err := want.Run(context.Background(), int64(len(s.sensed))); err != nil {
			t.Fatal(err)
		}
		for i, e := range s.commands {
			if e != whole.commands[i] {
				t.Fatalf("call %d failed: command %d is %+v, want %+v as without a fault", n, i, e, whole.commands[i])
			}
			if i > 0 && e.Decided-s.commands[i-1].Decided < holdOff {
				t.Fatalf("commands at ticks %d and %d", s.commands[i-1].Decided, e.Decided)
			}
		}
	}
	if tried < 10 {
		t.Errorf("only %d failed commands were tried", tried)
	}
}

func TestNegativeHoldOffPanics(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("a hold-off of -1 ticks did not panic")
		}
	}()
	s := &script{}
	controller.New(controller.Config{Sensor: s, Actuator: s, HoldOff: -1})
}

// Without a Keeper nothing travels.
func TestThresholdWithoutAKeeper(t *testing.T) {
	if got := scripted(&script{}, 0).Threshold(); got != (switching.KeeperState{}) {
		t.Errorf("%+v", got)
	}
}

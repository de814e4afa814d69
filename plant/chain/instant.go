package chain

import (
	"gonum.org/v1/gonum/floats"

	"brinkwell/plant/resonator"
)

// An instant is a time within a tick: what a Mover needs to know of it.
type instant struct {
	to       [3]float64       // row of the displacement at the instant: by displacement, velocity, lag
	bridge   resonator.Bridge // thermal displacement there
	response [states]float64  // of the states at the tick's end to a target moved by 1
}

// gridSteps make the table of instants where targets may move at any: between
// them it is interpolated linearly, off by some 1e-7 of the states, or by
// 1e-7·(tick/lag)² where a lag is shorter than the tick.
const gridSteps = 1024

// instants is either one instant or a table of them.
type instants struct {
	fixed  instant
	offset float64
	table  []instant
	system system
	dt     float64
}

func newInstants(s system, c MoverConfig) instants {
	t := instants{system: s, dt: c.Tick, offset: c.Offset}
	if !c.Anywhere {
		t.fixed = newInstant(s, c.Tick, c.Offset)
		return t
	}
	t.table = make([]instant, gridSteps+1)
	for i := range t.table {
		t.table[i] = newInstant(s, c.Tick, c.Tick*float64(i)/gridSteps)
	}
	return t
}

func newInstant(s system, dt, offset float64) instant {
	to, after, jump := s.flow(offset), s.flow(dt-offset), s.jump()
	in := instant{
		to:     [3]float64{to[stateU][stateU], to[stateU][stateV], to[stateU][stateLag]},
		bridge: resonator.NewBridge(s.oscillator, dt, offset),
	}
	for i := range after {
		in.response[i] = floats.Dot(after[i][:], jump[:])
	}
	return in
}

// at returns the instant at an offset, s.
func (t *instants) at(offset float64) instant {
	if t.table == nil {
		return t.fixed
	}
	k, f := t.place(offset)
	a, b := &t.table[k], &t.table[k+1]
	mix := func(x, y float64) float64 { return x + f*(y-x) }
	var in instant
	for i := range in.to {
		in.to[i] = mix(a.to[i], b.to[i])
	}
	for i := range in.response {
		in.response[i] = mix(a.response[i], b.response[i])
	}
	in.bridge = resonator.Bridge{
		GainX:  mix(a.bridge.GainX, b.bridge.GainX),
		GainV:  mix(a.bridge.GainV, b.bridge.GainV),
		Spread: mix(a.bridge.Spread, b.bridge.Spread),
	}
	return in
}

// since returns the response of the states a time after a target moved by 1,
// s, within one tick: what at's instant has until the tick's end.
func (t *instants) since(elapsed float64) [states]float64 {
	return t.at(t.dt - elapsed).response
}

func (t *instants) place(offset float64) (k int, f float64) {
	u := offset / t.dt * gridSteps
	k = min(max(int(u), 0), gridSteps-1)
	return k, u - float64(k)
}

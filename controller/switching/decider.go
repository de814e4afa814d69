package switching

import "brinkwell/controller/trace"

// A Decider is a Comparator with a hold-off after each change of level and,
// where it has a Keeper, a threshold that follows the sensor's zero. It must
// be made by NewDecider and must not be used by two goroutines at once.
type Decider struct {
	comparator Comparator
	wanted     float64 // threshold without travel, m
	holdOff    int64   // ticks
	held       int64   // ticks for which the level is still held
	keeper     *Keeper
}

// NewDecider makes a Decider from a comparator, whose threshold is the wanted
// one and whose level the present one. For holdOff ticks after a tick that
// changed the level it stays: two changes are at least holdOff ticks apart, so
// that 0 and 1 mean none. Without a keeper, nil, the threshold stays where it
// is. NewDecider panics if holdOff is negative.
func NewDecider(c Comparator, holdOff int64, keeper *Keeper) *Decider {
	if holdOff < 0 {
		panic("switching: negative hold-off")
	}
	d := &Decider{comparator: c, wanted: c.Threshold, holdOff: holdOff, keeper: keeper}
	if keeper != nil {
		d.comparator.Threshold += keeper.travel
	}
	return d
}

// Decide returns the level for the measured position x of a tick, in metres.
// It is to be called once a tick. What lies within a hold-off is forgotten:
// the first tick after it decides by its own position, and holds the level
// where that lies in the dead band.
func (d *Decider) Decide(x float64) trace.Level {
	if d.held > 0 {
		d.held--
	} else if before := d.comparator.Level; d.comparator.Decide(x) != before && d.holdOff > 0 {
		d.held = d.holdOff - 1
	}
	if d.keeper != nil && d.keeper.add(x, d.comparator.Level) {
		d.keeper.update()
		d.comparator.Threshold = d.wanted + d.keeper.travel
	}
	return d.comparator.Level
}

// Restore takes back a change of level that could not be commanded, and the
// hold-off with it: level is the one still in force. The Keeper does not
// forget the tick. Without a change to take back it does nothing.
func (d *Decider) Restore(level trace.Level) {
	if d.comparator.Level != level {
		d.comparator.Level, d.held = level, 0
	}
}

// Threshold is the present threshold, m.
func (d *Decider) Threshold() float64 { return d.comparator.Threshold }

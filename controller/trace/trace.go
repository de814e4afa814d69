// Package trace holds what flows through the house: a Sample a tick, an Event
// an actuation, both in a Block that goes to a Sink.
//
// It is a leaf: it computes nothing and imports nothing of ours.
package trace

// A Level is the index of an applied level. There are two today; everything
// that is kept for each level is indexed by it.
type Level uint8

// The two levels of a double well. The upper one is the level that pulls
// towards larger x, and so the well on that side.
const (
	Lower Level = iota
	Upper

	Levels = 2 // number of levels
)

// Sign is +1 for the upper level and -1 for the lower.
func (l Level) Sign() float64 { return 2*float64(l) - 1 }

func (l Level) String() string {
	if l == Upper {
		return "upper"
	}
	return "lower"
}

// A Sample is what is known of one tick.
type Sample struct {
	Measured float64 // position as the sensor gave it, m
	Position float64 // true position at the tick, m; only where Block.Truth
	Velocity float64 // true velocity at the tick, m/s; only where Block.Truth
	Level    Level   // decided from this sample; acts a latency later
}

// An Event is one actuation of a new level.
type Event struct {
	Decided  int64   // tick whose sample decided it
	Tick     int64   // last tick at or before the actuation
	Offset   float64 // from that tick to the actuation, s; in [0, 1/rate)
	Level    Level   // the new level
	Measured float64 // position by the sensor, interpolated to the actuation, m
	Position float64 // true position at the actuation, m; only where Block.Truth
	Work     float64 // done on the resonator by it, J; only where Block.Truth
}

// A Block is a stretch of consecutive ticks with the actuations that became
// known in it, oldest first. An actuation between the last tick of one block
// and the first of the next stands in the later one. The slices belong to the
// loop: a sink copies what it keeps.
type Block struct {
	Start   int64    // tick of Samples[0]
	Initial Level    // the level in force before the first Event
	Truth   bool     // whether true positions and velocities are known
	Samples []Sample // one a tick
	Events  []Event
}

// A Sink takes blocks in order. Take must not keep the block.
type Sink interface {
	Take(b *Block) error
}

// Package record keeps what flows through the loop: a directory with two
// Arrow IPC streams that any Arrow reader opens as they stand, samples.arrows
// and events.arrows, and sums.jsonl, which says where each of their batches
// lies and what its checksum is.
//
// A Writer is a sink. It writes a stretch of ticks at a time, a batch of
// either stream and then their line of sums.jsonl, each with write(2): what a
// crash of the program loses is the stretch in hand, at most 65,536 ticks of a
// full recording. There is no fsync until Close, so a crash of the machine may
// lose what the kernel still held. Nothing is compressed: the values are noise
// in nearly all their bits, and a compressor would take longer than the loop.
//
// A Reader checks every batch before Arrow sees it. A recording that was cut
// anywhere gives every whole stretch and says that it is incomplete; a changed
// byte anywhere is a DamageError.
//
// The package knows no clock and nothing of settings: the text that it keeps
// is opaque to it.
package record

import "brinkwell/controller/trace"

// The files of a recording.
const (
	samplesFile = "samples.arrows"
	eventsFile  = "events.arrows"
	sumsFile    = "sums.jsonl"
)

const format = 1 // version of all three files

// Bounds of a stretch; whatever is reached first ends it.
const (
	// maxRows are the rows of a batch. At 65,536 the fixed cost of a batch, some
	// 1.5 kB and 20 µs, is below a thousandth of it and of the loop's time.
	maxRows = 1 << 16
	// maxTicks bounds what a crash can lose of a recording with few samples: one
	// second at 1 MHz.
	maxTicks = 1 << 20
	// maxRuns bounds the line of a stretch whose blocks all differ in length.
	maxRuns = 256
)

// A reader refuses anything longer, so that no length in a file can ask for
// much memory.
const (
	maxSegment = 8 << 20 // bytes of a batch or a header; the longest batch takes 5 MB
	maxLine    = 16 << 10
	maxText    = 1 << 20 // bytes of settings and extras
)

// valid reports whether l can index what is kept for each level.
func valid(l trace.Level) bool { return l < trace.Levels }

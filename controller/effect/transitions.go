package effect

import (
	"math"

	"brinkwell/controller/trace"
)

// transitions follows the actuations: raw dwell times, and settled ones. A
// raw switch is an actuation of a new level; a settled transition stays on
// its new side for at least one full period. A resonator whose energy is above
// the barrier is back before a period is over, so that a settled transition
// is one between trapped states, and what is left is recrossing and chatter.
type transitions struct {
	rate   float64 // ticks, 1/s
	period float64 // s

	start   int64 // first tick of the run
	now     int64 // tick after the last
	present instant
	raw     trace.Level // the present level
	settled trace.Level // the last level that stayed for a period
	since   instant     // since when, settled
}

// An instant is a tick and a time after it, so that no long time is ever a
// rounded sum.
type instant struct {
	tick   int64
	offset float64 // s
}

// after returns how long i is after j, s.
func (t *transitions) after(i, j instant) float64 {
	return float64(i.tick-j.tick)/t.rate + (i.offset - j.offset)
}

func newTransitions(r Reference) transitions {
	return transitions{rate: r.Rate, period: 2 * math.Pi / r.Oscillator.Omega0}
}

func (t *transitions) begin(start int64, level trace.Level) {
	t.start, t.now = start, start
	t.present, t.since = instant{tick: start}, instant{tick: start}
	t.startAs(level)
}

// startAs corrects the level at the start: an actuation decided before the
// first tick became known after it.
func (t *transitions) startAs(level trace.Level) { t.raw, t.settled = level, level }

// add books an actuation in a row of sums.
func (t *transitions) add(e *trace.Event, row []float64) {
	at := instant{e.Tick, e.Offset}
	t.settle(at, row)
	row[sumRaw+int(t.raw)]++
	row[sumRawDwell+int(t.raw)] += t.after(at, t.present)
	t.raw, t.present = e.Level, at
}

// settle books the present level as settled if it has stayed for a period at
// the given time.
func (t *transitions) settle(at instant, row []float64) {
	if t.raw == t.settled || t.after(at, t.present) < t.period {
		return
	}
	row[sumSettled+int(t.settled)]++
	row[sumDwell+int(t.settled)] += t.after(t.present, t.since)
	t.settled, t.since = t.raw, t.present
}

// finish books what the end of the run cuts off, into a row that is not kept:
// the time of a dwell that did not end counts, its end does not, which makes
// time over departures the maximum-likelihood mean of exponential dwells.
func (t transitions) finish(row []float64) {
	end := instant{tick: t.now}
	t.settle(end, row)
	row[sumDwell+int(t.settled)] += t.after(end, t.since)
	row[sumRawDwell+int(t.raw)] += t.after(end, t.present)
}

// Package effect measures from a trace what the loop did to the potential:
// the landscape that was really made, temperatures, crossings, their energy
// and the loop's power, each with its interval.
//
// An Observer is a sink with constant memory, whatever the run's length. The
// package knows what was asked only as a Reference, and neither plants nor
// predictions.
package effect

import (
	"errors"
	"fmt"
	"math"

	hdrhistogram "github.com/HdrHistogram/hdrhistogram-go"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trace"
	"brinkwell/plant/motion"
)

// A Reference is what was asked: the units in which the effect is stated, and
// where to look.
type Reference struct {
	Rate         float64 // ticks, 1/s
	Oscillator   motion.Oscillator
	HalfDistance float64 // x1, from the midpoint to either well, m
	Threshold    float64 // x0, from the midpoint, m
	SensorNoise  float64 // known standard deviation of one sample, m
	SensorCorner float64 // bandwidth of that noise, Hz; 0: white
	LostTicks    bool    // whether ticks may lack a measured position
}

// sigma is the thermal width of one well, m.
func (r Reference) sigma() float64 { return math.Sqrt(r.Oscillator.KT / r.Oscillator.Stiffness) }

func (r Reference) validate() error {
	for _, f := range []struct {
		name  string
		value float64
	}{
		{"rate", r.Rate},
		{"omega0", r.Oscillator.Omega0},
		{"quality", r.Oscillator.Quality},
		{"stiffness", r.Oscillator.Stiffness},
		{"thermal energy", r.Oscillator.KT},
		{"half distance", r.HalfDistance},
	} {
		if !(f.value > 0) || math.IsInf(f.value, 0) {
			return fmt.Errorf("effect: %s is %g, want a positive number", f.name, f.value)
		}
	}
	if !(r.SensorNoise >= 0) || math.IsInf(r.SensorNoise, 0) || math.IsNaN(r.Threshold) || math.IsInf(r.Threshold, 0) {
		return errors.New("effect: threshold and sensor noise must be finite, the noise not negative")
	}
	return nil
}

// Rows of sums, see estimate.Batches: these, then for the true and for the
// measured positions their moments and histogram.
const (
	sumTicks       = iota
	sumVelocity2   // m²/s²
	sumActuations  // raw switches
	sumLatency     // s
	sumOvershoot   // m
	sumWork        // J
	sumSeenOver    // overshoot by measured positions, m
	sumPairs       // pairs of measured positions a lag apart
	sumDiff1       // their squared differences, m²
	sumDiff2       // the same over twice the lag, m²
	sumSettled     // settled departures from each level …
	sumDwell       = sumSettled + trace.Levels
	sumRaw         = sumDwell + trace.Levels // raw departures from each level
	sumRawDwell    = sumRaw + trace.Levels
	sumsOfTheRun   = sumRawDwell + trace.Levels
	batchesWanted  = 128
	shortestBatch  = 1024 // ticks
	fewestEvents   = 10   // a mean over fewer actuations has no interval
	fewestSwitches = 2
)

// Latencies are counted in picoseconds, to three digits, up to 1,000 s.
const (
	latencyUnit    = 1e-12 // s
	longestLatency = 1e15
)

// An Observer takes the blocks of a run and keeps the sums that the effect is
// computed from. It must be made by New and must not be used by two
// goroutines at once.
type Observer struct {
	ref     Reference
	scale   scale
	batches *estimate.Batches
	truth   bool
	started bool

	position, measured tally
	lagged             lagged
	transitions        transitions
	latencies          *hdrhistogram.Histogram
}

// New makes an Observer.
func New(ref Reference) (*Observer, error) {
	if err := ref.validate(); err != nil {
		return nil, err
	}
	s := newScale(ref)
	o := &Observer{
		ref:         ref,
		scale:       s,
		batches:     estimate.NewBatches(sumsOfTheRun+2*(momentSums+s.bins), batchesWanted, shortestBatch),
		position:    newTally(s),
		measured:    newTally(s),
		lagged:      newLagged(ref),
		transitions: newTransitions(ref),
		latencies:   hdrhistogram.New(1, longestLatency, 3),
	}
	return o, nil
}

// Take books a block.
func (o *Observer) Take(b *trace.Block) error {
	if !o.started {
		o.started = true
		o.truth = b.Truth
		o.transitions.begin(b.Start, b.Initial)
	}
	samples, events, start := b.Samples, b.Events, b.Start
	for len(samples) > 0 {
		n := int(min(int64(len(samples)), o.batches.Room()))
		// What happened before the stretch's last tick belongs to the stretch.
		k := 0
		for k < len(events) && events[k].Tick < start+int64(n)-1 {
			k++
		}
		if n == len(samples) {
			k = len(events)
		}
		o.stretch(start, samples[:n], events[:k])
		samples, events, start = samples[n:], events[k:], start+int64(n)
	}
	return nil
}

// stretch books consecutive ticks that go into one row, with their events.
func (o *Observer) stretch(start int64, samples []trace.Sample, events []trace.Event) {
	row := o.batches.Row()
	switch {
	case o.truth && !o.ref.LostTicks:
		row[sumVelocity2] += tallyBoth(&o.position, &o.measured, samples)
	case o.truth:
		row[sumVelocity2] += o.position.tallyTrue(samples)
		fallthrough
	default:
		o.measured.tallyMeasured(samples)
	}
	o.lagged.add(start, samples, row)
	for i := range events {
		o.event(&events[i], row)
	}
	o.transitions.now = start + int64(len(samples))
	row[sumTicks] += float64(len(samples))
	if int64(len(samples)) == o.batches.Room() {
		o.flush(row)
	}
	o.batches.Advance(int64(len(samples)))
}

// flush moves the tallies' counts into the row.
func (o *Observer) flush(row []float64) {
	half := momentSums + o.scale.bins
	o.position.flush(row[sumsOfTheRun : sumsOfTheRun+half])
	o.measured.flush(row[sumsOfTheRun+half:])
}

// event books an actuation.
func (o *Observer) event(e *trace.Event, row []float64) {
	if e.Tick < o.transitions.start {
		o.transitions.startAs(e.Level)
		return
	}
	o.transitions.add(e, row)
	side := e.Level.Sign()
	row[sumActuations]++
	latency := float64(e.Tick-e.Decided)/o.ref.Rate + e.Offset
	row[sumLatency] += latency
	// Beyond the histogram's reach the longest that it holds is booked.
	_ = o.latencies.RecordValue(min(int64(math.Round(latency/latencyUnit)), longestLatency))
	row[sumSeenOver] += side * (e.Measured - o.ref.Threshold)
	if o.truth {
		row[sumOvershoot] += side * (e.Position - o.ref.Threshold)
		row[sumWork] += e.Work
	}
}

package record

import (
	"context"
	"errors"
	"fmt"

	"github.com/apache/arrow-go/v18/arrow"
	"github.com/apache/arrow-go/v18/arrow/array"

	"brinkwell/controller/trace"
)

// A Summary says what was read.
type Summary struct {
	Ticks    int64 // of the stretches read, whether their samples were kept or not
	Samples  int64
	Events   int64
	Gaps     int64  // places where ticks are missing
	Missing  int64  // ticks in gaps
	Complete bool   // whether this is all that was written
	Cut      string // what is missing, where it is not complete
}

// errContent means that a batch holds what no Writer takes.
var errContent = errors.New("its content is impossible")

// Replay delivers a recording as the loop did: the same blocks with the same
// events, in order; a gap shows in the blocks' Start. The blocks belong to the
// Reader. When ctx ends it stops at the end of a block.
//
// A recording that ends early is no error: the Summary says so. A changed byte
// is a DamageError, after all that comes before it was delivered. A recording
// that does not hold every tick is an ErrDecimated.
func (r *Reader) Replay(ctx context.Context, sinks ...trace.Sink) (Summary, error) {
	if r.head.Every != 1 {
		return Summary{}, fmt.Errorf("%w, and the recording was made with every=%d: read its samples and events one by one", ErrDecimated, r.head.Every)
	}
	p := &player{reader: r, sinks: sinks}
	return r.walk(true, true, func(e *entry, samples *sampleBatch, events *eventBatch) (n, k int64, err error) {
		return p.play(ctx, e, samples, events)
	})
}

// Samples calls f for each sample that was kept, in order, until it returns an
// error. Where the truth is not known the sample's is zero.
func (r *Reader) Samples(f func(tick int64, s trace.Sample) error) (Summary, error) {
	return r.walk(true, false, func(_ *entry, b *sampleBatch, _ *eventBatch) (n, _ int64, err error) {
		var s trace.Sample
		for i, tick := range b.tick {
			b.at(i, &s)
			if err := f(tick, s); err != nil {
				return int64(i), 0, err
			}
		}
		return int64(len(b.tick)), 0, nil
	})
}

// Events calls f for each event, in order, until it returns an error. Where
// the truth is not known the event's is zero.
func (r *Reader) Events(f func(e trace.Event) error) (Summary, error) {
	return r.walk(false, true, func(_ *entry, _ *sampleBatch, b *eventBatch) (_, k int64, err error) {
		for i := range b.tick {
			if err := f(b.at(i)); err != nil {
				return 0, int64(i), err
			}
		}
		return 0, int64(len(b.tick)), nil
	})
}

// walk goes through the stretches, as far as the wanted streams have them, and
// counts what f says that it delivered.
func (r *Reader) walk(withSamples, withEvents bool, f func(*entry, *sampleBatch, *eventBatch) (n, k int64, err error)) (s Summary, err error) {
	var decoders [2]*decoder
	for i, want := range []struct {
		on     bool
		source *source
		fields []arrow.Field
		header segment
	}{
		{withSamples, &r.samples, sampleFields, r.header.Samples},
		{withEvents, &r.events, eventFields, r.header.Events},
	} {
		if !want.on {
			continue
		}
		if decoders[i], err = newDecoder(want.source, want.fields, want.header); errors.Is(err, errCut) {
			s.Cut = fmt.Sprintf("%s ends within its header", want.source.name)
			return s, nil
		} else if err != nil {
			return s, damageOf(want.source.name, nil, err)
		}
	}
	next := r.head.First
	for i := range r.entries {
		e := &r.entries[i]
		samples, events, file, err := read(e, decoders, r.head)
		if errors.Is(err, errCut) {
			s.Cut = fmt.Sprintf("%s ends before its batch %d (ticks %d to %d)", file, e.Stretch, e.First, e.last())
			return s, nil
		} else if err != nil {
			return s, damageOf(file, e, err)
		}
		n, k, err := f(e, samples, events)
		s.Samples, s.Events = s.Samples+n, s.Events+k
		if err != nil {
			return s, err
		}
		s.Ticks += e.Ticks
		if e.First > next {
			s.Gaps++
			s.Missing += e.First - next
		}
		next = e.First + e.Ticks
	}
	return r.finish(s, next, decoders)
}

// read gets the batches of a stretch from the decoders that there are, and
// names the file that failed.
func read(e *entry, decoders [2]*decoder, h Header) (samples *sampleBatch, events *eventBatch, file string, err error) {
	if d := decoders[0]; d != nil {
		b, err := d.batch(e.Samples)
		if err != nil {
			return nil, nil, samplesFile, err
		}
		if samples, err = newSampleBatch(b, e, h); err != nil {
			return nil, nil, samplesFile, err
		}
	}
	if d := decoders[1]; d != nil {
		b, err := d.batch(e.Events)
		if err != nil {
			return nil, nil, eventsFile, err
		}
		if events, err = newEventBatch(b, e, h); err != nil {
			return nil, nil, eventsFile, err
		}
	}
	return samples, events, "", nil
}

// finish checks what comes after the last stretch.
func (r *Reader) finish(s Summary, next int64, decoders [2]*decoder) (Summary, error) {
	switch {
	case r.damage != nil:
		return s, r.damage
	case r.end == nil:
		s.Cut = fmt.Sprintf("it was not closed: what came after tick %d is missing", next-1)
		return s, nil
	}
	for i, d := range decoders {
		if d == nil {
			continue
		}
		g := [2]segment{r.end.Samples, r.end.Events}[i]
		beyond := *r.end
		beyond.First, beyond.Ticks = next, 0
		err := d.read(g)
		if err == nil && d.source.size != g.At+g.Bytes {
			err = fmt.Errorf("%w: %d bytes come after its end", errMessage, d.source.size-g.At-g.Bytes)
		}
		if errors.Is(err, errCut) {
			s.Cut = d.source.name + " ends before its end mark"
			return s, nil
		} else if err != nil {
			return s, damageOf(d.source.name, &beyond, err)
		}
	}
	s.Complete = true
	return s, nil
}

// A player cuts stretches into the blocks that they were.
type player struct {
	reader  *Reader
	sinks   []trace.Sink
	samples []trace.Sample
	events  []trace.Event
}

// play delivers a stretch and counts its samples and events.
func (p *player) play(ctx context.Context, e *entry, samples *sampleBatch, events *eventBatch) (n, k int64, err error) {
	force := e.Initial
	for _, run := range e.Runs {
		for range run[0] {
			if err := ctx.Err(); err != nil {
				return n, k, err
			}
			p.samples = p.samples[:0]
			if int64(cap(p.samples)) < run[1] {
				p.samples = make([]trace.Sample, 0, run[1])
			}
			p.samples = p.samples[:run[1]]
			for i := range p.samples {
				samples.at(int(n)+i, &p.samples[i])
			}
			b := trace.Block{Start: e.First + n, Initial: force, Truth: p.reader.head.Truth, Samples: p.samples}
			p.events = p.events[:0]
			for ; int(k) < len(events.known) && events.known[k] == b.Start; k++ {
				p.events = append(p.events, events.at(int(k)))
				force = p.events[len(p.events)-1].Level
			}
			b.Events = p.events
			n += run[1]
			for _, s := range p.sinks {
				if err := s.Take(&b); err != nil {
					return n, k, err
				}
			}
		}
	}
	if int(k) != len(events.known) {
		return n, k, damageOf(eventsFile, e, fmt.Errorf("%w: an event became known at tick %d, where no block begins", errContent, events.known[k]))
	}
	return n, k, nil
}

// A sampleBatch is the columns of a batch of samples.
type sampleBatch struct {
	truth                        bool
	tick                         []int64
	measured, position, velocity []float64
	level                        []uint8
}

func newSampleBatch(b arrow.RecordBatch, e *entry, h Header) (*sampleBatch, error) {
	s := &sampleBatch{truth: h.Truth}
	if b == nil {
		return s, nil
	}
	s.tick = b.Column(colTick).(*array.Int64).Int64Values()
	s.measured = b.Column(colMeasured).(*array.Float64).Float64Values()
	s.position = b.Column(colPosition).(*array.Float64).Float64Values()
	s.velocity = b.Column(colVelocity).(*array.Float64).Float64Values()
	s.level = b.Column(colLevel).(*array.Uint8).Uint8Values()
	if known := b.Column(colPosition).NullN() == 0 && b.Column(colVelocity).NullN() == 0; known != h.Truth {
		return nil, fmt.Errorf("%w: whether the truth is known is %t, want %t", errContent, known, h.Truth)
	}
	next := firstKept(e.First, h.Every)
	for i, tick := range s.tick {
		if tick != next {
			return nil, fmt.Errorf("%w: tick %d stands where %d belongs", errContent, tick, next)
		}
		if !valid(trace.Level(s.level[i])) {
			return nil, fmt.Errorf("%w: level %d at tick %d", errContent, s.level[i], tick)
		}
		next += h.Every
	}
	return s, nil
}

func (b *sampleBatch) at(i int, s *trace.Sample) {
	s.Measured, s.Level = b.measured[i], trace.Level(b.level[i])
	if b.truth {
		s.Position, s.Velocity = b.position[i], b.velocity[i]
	}
}

// An eventBatch is the columns of a batch of events.
type eventBatch struct {
	truth                            bool
	decided, tick, known             []int64
	offset, measured, position, work []float64
	level                            []uint8
}

func newEventBatch(b arrow.RecordBatch, e *entry, h Header) (*eventBatch, error) {
	v := &eventBatch{truth: h.Truth}
	if b == nil {
		return v, nil
	}
	v.tick = b.Column(evTick).(*array.Int64).Int64Values()
	v.decided = b.Column(evDecided).(*array.Int64).Int64Values()
	v.known = b.Column(evKnown).(*array.Int64).Int64Values()
	v.offset = b.Column(evOffset).(*array.Float64).Float64Values()
	v.measured = b.Column(evMeasured).(*array.Float64).Float64Values()
	v.position = b.Column(evPosition).(*array.Float64).Float64Values()
	v.work = b.Column(evWork).(*array.Float64).Float64Values()
	v.level = b.Column(evLevel).(*array.Uint8).Uint8Values()
	if known := b.Column(evPosition).NullN() == 0 && b.Column(evWork).NullN() == 0; known != h.Truth {
		return nil, fmt.Errorf("%w: whether the truth is known is %t, want %t", errContent, known, h.Truth)
	}
	for i, level := range v.level {
		if !valid(trace.Level(level)) {
			return nil, fmt.Errorf("%w: level %d at tick %d", errContent, level, v.tick[i])
		}
		if v.known[i] < e.First || v.known[i] > e.last() || i > 0 && v.known[i] < v.known[i-1] {
			return nil, fmt.Errorf("%w: event %d became known at tick %d", errContent, i, v.known[i])
		}
	}
	return v, nil
}

func (b *eventBatch) at(i int) trace.Event {
	e := trace.Event{
		Decided: b.decided[i], Tick: b.tick[i], Offset: b.offset[i],
		Level: trace.Level(b.level[i]), Measured: b.measured[i],
	}
	if b.truth {
		e.Position, e.Work = b.position[i], b.work[i]
	}
	return e
}

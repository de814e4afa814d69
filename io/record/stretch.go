package record

import (
	"fmt"

	"github.com/apache/arrow-go/v18/arrow"
	"github.com/apache/arrow-go/v18/arrow/array"
	"github.com/apache/arrow-go/v18/arrow/memory"

	"brinkwell/controller/trace"
)

// A stretch is what a Writer gathers for one batch of either stream:
// consecutive blocks, by columns.
type stretch struct {
	head    *Header
	first   int64
	ticks   int64
	initial trace.Level
	runs    [][2]int64 // blocks: how many of what length

	tick                         []int64
	measured, position, velocity []float64
	level                        []uint8
	volts                        []float64

	evTick, evDecided, evKnown []int64
	evTime, evOffset           []float64
	evPosition, evMeasured     []float64
	evWork                     []float64
	evLevel                    []uint8
}

func newStretch(h *Header) *stretch {
	s := &stretch{
		head:     h,
		runs:     make([][2]int64, 0, maxRuns),
		tick:     make([]int64, 0, maxRows),
		measured: make([]float64, 0, maxRows),
		level:    make([]uint8, 0, maxRows),
	}
	if h.Truth {
		s.position = make([]float64, 0, maxRows)
		s.velocity = make([]float64, 0, maxRows)
	}
	if h.Volts != nil {
		s.volts = make([]float64, 0, maxRows)
	}
	return s
}

func (s *stretch) reset() {
	s.ticks, s.runs = 0, s.runs[:0]
	for _, c := range []*[]int64{&s.tick, &s.evTick, &s.evDecided, &s.evKnown} {
		*c = (*c)[:0]
	}
	for _, c := range []*[]float64{
		&s.measured, &s.position, &s.velocity, &s.volts,
		&s.evTime, &s.evOffset, &s.evPosition, &s.evMeasured, &s.evWork,
	} {
		*c = (*c)[:0]
	}
	s.level, s.evLevel = s.level[:0], s.evLevel[:0]
}

// kept is how many of n ticks from start on are divisible by every.
func kept(start, n, every int64) int64 { return floorDiv(start+n-1, every) - floorDiv(start-1, every) }

// firstKept is the first tick from start on that every divides.
func firstKept(start, every int64) int64 { return -floorDiv(-start, every) * every }

// floorDiv is a / b towards minus infinity, b > 0.
func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

// fits reports whether a block can join the stretch.
func (s *stretch) fits(b *trace.Block) bool {
	n := int64(len(b.Samples))
	return int64(len(s.tick))+kept(b.Start, n, s.head.Every) <= maxRows &&
		len(s.evTick)+len(b.Events) <= maxRows &&
		s.ticks+n <= maxTicks &&
		(len(s.runs) < maxRuns || s.runs[maxRuns-1][1] == n)
}

// isFull reports whether it is no use to wait for another block.
func (s *stretch) isFull() bool {
	return len(s.tick) == maxRows || len(s.evTick) == maxRows || s.ticks == maxTicks
}

// add appends a block that fits. The stretch is unchanged if it refuses it.
func (s *stretch) add(b *trace.Block) error {
	for i := range b.Events {
		if e := &b.Events[i]; !valid(e.Level) {
			return fmt.Errorf("record: an event at tick %d has level %d, want below %d", e.Tick, e.Level, trace.Levels)
		}
	}
	var worst trace.Level
	for i := range b.Samples {
		worst = max(worst, b.Samples[i].Level)
	}
	if !valid(worst) {
		return fmt.Errorf("record: the block at tick %d has level %d, want below %d", b.Start, worst, trace.Levels)
	}
	if s.ticks == 0 {
		s.first, s.initial = b.Start, b.Initial
	}
	n := int64(len(b.Samples))
	s.ticks += n
	if k := len(s.runs); k > 0 && s.runs[k-1][1] == n {
		s.runs[k-1][0]++
	} else {
		s.runs = append(s.runs, [2]int64{1, n})
	}
	s.addSamples(b)
	s.addEvents(b)
	return nil
}

func (s *stretch) addSamples(b *trace.Block) {
	every := s.head.Every
	from, n := len(s.tick), int(kept(b.Start, int64(len(b.Samples)), every))
	to := from + n
	s.tick, s.measured, s.level = s.tick[:to], s.measured[:to], s.level[:to]
	tick, measured, level := s.tick[from:], s.measured[from:], s.level[from:]
	next := firstKept(b.Start, every)
	for i := range tick {
		p := &b.Samples[next-b.Start]
		tick[i], measured[i], level[i] = next, p.Measured, uint8(p.Level)
		next += every
	}
	if s.head.Truth {
		s.position, s.velocity = s.position[:to], s.velocity[:to]
		position, velocity := s.position[from:], s.velocity[from:]
		for i := range position {
			p := &b.Samples[tick[i]-b.Start]
			position[i], velocity[i] = p.Position, p.Velocity
		}
	}
	if s.head.Volts != nil {
		for _, l := range level {
			s.volts = append(s.volts, s.head.Volts[l])
		}
	}
}

func (s *stretch) addEvents(b *trace.Block) {
	for i := range b.Events {
		e := &b.Events[i]
		s.evTime = append(s.evTime, float64(e.Tick)/s.head.Rate+e.Offset)
		s.evTick = append(s.evTick, e.Tick)
		s.evOffset = append(s.evOffset, e.Offset)
		s.evDecided = append(s.evDecided, e.Decided)
		s.evLevel = append(s.evLevel, uint8(e.Level))
		s.evMeasured = append(s.evMeasured, e.Measured)
		s.evKnown = append(s.evKnown, b.Start)
		if s.head.Truth {
			s.evPosition = append(s.evPosition, e.Position)
			s.evWork = append(s.evWork, e.Work)
		}
	}
}

func (s *stretch) sampleColumns() []arrow.Array {
	n := len(s.tick)
	return []arrow.Array{
		colTick:     column(integer, n, arrow.Int64Traits.CastToBytes(s.tick)),
		colMeasured: column(real64, n, arrow.Float64Traits.CastToBytes(s.measured)),
		colPosition: column(real64, n, arrow.Float64Traits.CastToBytes(s.position)),
		colVelocity: column(real64, n, arrow.Float64Traits.CastToBytes(s.velocity)),
		colLevel:    column(small, n, s.level),
		colVolts:    column(real64, n, arrow.Float64Traits.CastToBytes(s.volts)),
	}
}

func (s *stretch) eventColumns() []arrow.Array {
	n := len(s.evTick)
	return []arrow.Array{
		evTime:     column(real64, n, arrow.Float64Traits.CastToBytes(s.evTime)),
		evTick:     column(integer, n, arrow.Int64Traits.CastToBytes(s.evTick)),
		evOffset:   column(real64, n, arrow.Float64Traits.CastToBytes(s.evOffset)),
		evDecided:  column(integer, n, arrow.Int64Traits.CastToBytes(s.evDecided)),
		evLevel:    column(small, n, s.evLevel),
		evPosition: column(real64, n, arrow.Float64Traits.CastToBytes(s.evPosition)),
		evMeasured: column(real64, n, arrow.Float64Traits.CastToBytes(s.evMeasured)),
		evWork:     column(real64, n, arrow.Float64Traits.CastToBytes(s.evWork)),
		evKnown:    column(integer, n, arrow.Int64Traits.CastToBytes(s.evKnown)),
	}
}

// nulls stand in for the values and the validity of a column that is not
// known. They are only ever read.
var nulls [8 * maxRows]byte

// column wraps n values, without a copy; without values all are null.
func column(t arrow.DataType, n int, values []byte) arrow.Array {
	var validity *memory.Buffer
	unknown := 0
	if len(values) == 0 && n > 0 {
		unknown = n
		validity = memory.NewBufferBytes(nulls[:(n+7)/8])
		values = nulls[:n*t.(arrow.FixedWidthDataType).Bytes()]
	}
	data := array.NewData(t, n, []*memory.Buffer{validity, memory.NewBufferBytes(values)}, nil, unknown, 0)
	defer data.Release()
	return array.MakeFromData(data)
}

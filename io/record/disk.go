package record

import (
	"bufio"
	"hash/crc32"

	"github.com/apache/arrow-go/v18/arrow"
	"github.com/apache/arrow-go/v18/arrow/array"
	"github.com/apache/arrow-go/v18/arrow/ipc"
	"github.com/apache/arrow-go/v18/arrow/memory"
)

// endOfStream is what ends an Arrow IPC stream.
var endOfStream = []byte{0xff, 0xff, 0xff, 0xff, 0, 0, 0, 0}

// A stream is an Arrow stream that is being written.
type stream struct {
	name   string
	file   file
	schema *arrow.Schema
	at     int64  // bytes written
	sum    uint32 // of the segment in hand
	buffer *bufio.Writer
}

// Write passes on what the buffer gathered.
func (s *stream) Write(p []byte) (int, error) {
	n, err := s.file.Write(p)
	s.at += int64(n)
	s.sum = crc32.Update(s.sum, castagnoli, p[:n])
	return n, err
}

// segment writes one segment, through to the file.
func (s *stream) segment(rows int64, write func() error) (segment, error) {
	g := segment{At: s.at, Rows: rows}
	s.sum = 0
	if err := write(); err != nil {
		return g, err
	}
	if err := s.buffer.Flush(); err != nil {
		return g, err
	}
	g.Bytes, g.Sum = s.at-g.At, s.sum
	return g, nil
}

// payload writes an Arrow message.
func (s *stream) payload(rows int64, p ipc.Payload) (segment, error) {
	defer p.Release()
	return s.segment(rows, func() error {
		_, err := p.WritePayload(s.buffer)
		return err
	})
}

// batch writes columns, unless they are empty.
func (s *stream) batch(rows int64, columns []arrow.Array) (segment, error) {
	if rows == 0 {
		return segment{At: s.at}, nil
	}
	batch := array.NewRecordBatch(s.schema, columns, rows)
	defer batch.Release()
	for _, c := range columns {
		c.Release()
	}
	p, err := ipc.GetRecordBatchPayload(batch)
	if err != nil {
		return segment{}, err
	}
	return s.payload(rows, p)
}

// A disk is the three files of a recording that is being written.
type disk struct {
	samples, events stream
	sums            file
	line            []byte

	number int64 // of stretches written
	ticks  int64
	next   int64 // tick
}

func newDisk(open func(name string) (file, error)) (*disk, error) {
	d := &disk{samples: stream{name: samplesFile}, events: stream{name: eventsFile}}
	var err error
	if d.samples.file, err = open(samplesFile); err != nil {
		return nil, &WriteError{File: samplesFile, Err: err}
	}
	if d.events.file, err = open(eventsFile); err != nil {
		_ = d.samples.file.Close()
		return nil, &WriteError{File: eventsFile, Err: err}
	}
	if d.sums, err = open(sumsFile); err != nil {
		_ = d.samples.file.Close()
		_ = d.events.file.Close()
		return nil, &WriteError{File: sumsFile, Err: err}
	}
	// Columns are longer than the buffer and pass it by, uncopied.
	d.samples.buffer = bufio.NewWriterSize(&d.samples, 1<<14)
	d.events.buffer = bufio.NewWriterSize(&d.events, 1<<14)
	return d, nil
}

// fault is what a Writer reports when a file failed.
func (d *disk) fault(name string, err error) *WriteError {
	return &WriteError{File: name, Ticks: d.ticks, Err: err}
}

// both writes a segment of either stream. Events come first, so that a cut
// stream of samples never lacks those of a sample that it has.
func (d *disk) both(e *entry, write func(s *stream) (segment, error)) *WriteError {
	var err error
	if e.Events, err = write(&d.events); err != nil {
		return d.fault(eventsFile, err)
	}
	if e.Samples, err = write(&d.samples); err != nil {
		return d.fault(samplesFile, err)
	}
	return nil
}

func (d *disk) enter(e *entry) *WriteError {
	d.line = appendLine(d.line[:0], e)
	if _, err := d.sums.Write(d.line); err != nil {
		return d.fault(sumsFile, err)
	}
	return nil
}

func (d *disk) begin(h Header) *WriteError {
	d.samples.schema, d.events.schema = schema(sampleFields, h), schema(eventFields, h)
	d.next = h.First
	e := entry{Kind: kindHeader, Format: format, First: h.First}
	if err := d.both(&e, func(s *stream) (segment, error) {
		return s.payload(0, ipc.GetSchemaPayload(s.schema, memory.DefaultAllocator))
	}); err != nil {
		return err
	}
	return d.enter(&e)
}

func (d *disk) write(s *stretch) *WriteError {
	e := entry{
		Kind: kindStretch, Stretch: d.number,
		First: s.first, Ticks: s.ticks, Initial: s.initial, Runs: s.runs,
	}
	var err error
	if e.Events, err = d.events.batch(int64(len(s.evTick)), s.eventColumns()); err != nil {
		return d.fault(eventsFile, err)
	}
	if e.Samples, err = d.samples.batch(int64(len(s.tick)), s.sampleColumns()); err != nil {
		return d.fault(samplesFile, err)
	}
	if err := d.enter(&e); err != nil {
		return err
	}
	d.number++
	d.ticks += s.ticks
	d.next = s.first + s.ticks
	return nil
}

// end marks the streams as whole and brings everything to the disk, the end
// mark last.
func (d *disk) end() *WriteError {
	e := entry{Kind: kindEnd, Stretch: d.number, First: d.next}
	if err := d.both(&e, func(s *stream) (segment, error) {
		return s.segment(0, func() error { _, err := s.buffer.Write(endOfStream); return err })
	}); err != nil {
		return err
	}
	for _, s := range []*stream{&d.events, &d.samples} {
		if err := s.file.Sync(); err != nil {
			return d.fault(s.name, err)
		}
	}
	if err := d.enter(&e); err != nil {
		return err
	}
	if err := d.sums.Sync(); err != nil {
		return d.fault(sumsFile, err)
	}
	return nil
}

func (d *disk) close() (first *WriteError) {
	for _, f := range []struct {
		name string
		file file
	}{{eventsFile, d.events.file}, {samplesFile, d.samples.file}, {sumsFile, d.sums}} {
		if err := f.file.Close(); err != nil && first == nil {
			first = d.fault(f.name, err)
		}
	}
	return first
}

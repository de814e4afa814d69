package record

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"hash/crc32"

	"brinkwell/controller/trace"
)

// castagnoli is the polynomial of CRC-32C, which processors compute by
// themselves.
var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// A segment is a piece of a stream: its header, a batch or its end. An empty
// batch is not written and has no bytes.
type segment struct {
	At    int64  `json:"at"`
	Bytes int64  `json:"bytes"`
	Rows  int64  `json:"rows"`
	Sum   uint32 `json:"crc32c"`
}

// An entry is a line of sums.jsonl. There is one for the headers, one for each
// stretch and, when the Writer was closed, one for the ends of the streams.
// One line for the batches of both streams makes them come into being at once.
type entry struct {
	Kind    string      `json:"kind"`
	Format  int         `json:"format,omitempty"` // of kindHeader
	Stretch int64       `json:"stretch"`          // number of the stretch; at the end, of stretches
	First   int64       `json:"first_tick"`       // of the stretch, or the next one
	Ticks   int64       `json:"ticks"`            // of the stretch, kept or not
	Initial trace.Level `json:"initial_level"`    // in force before the first event
	Runs    [][2]int64  `json:"blocks,omitempty"` // how many of what length
	Samples segment     `json:"samples"`          // in samples.arrows
	Events  segment     `json:"events"`           // in events.arrows
}

const (
	kindHeader  = "header"
	kindStretch = "stretch"
	kindEnd     = "end"
)

func (e *entry) last() int64 { return e.First + e.Ticks - 1 }

// A line is the entry's JSON between these, the sum of which stands in it as
// eight hexadecimal digits: JSON to anyone, and yet each byte is checked.
const (
	lineOpen  = `{"entry":`
	lineSum   = `,"crc32c":"`
	lineClose = "\"}\n"
	lineTail  = len(lineSum) + 8 + len(lineClose)
)

func appendLine(dst []byte, e *entry) []byte {
	text, err := json.Marshal(e)
	if err != nil {
		panic("record: " + err.Error()) // integers and strings alone
	}
	dst = append(dst, lineOpen...)
	dst = append(dst, text...)
	dst = append(dst, lineSum...)
	return fmt.Appendf(dst, "%08x%s", crc32.Checksum(text, castagnoli), lineClose)
}

var (
	errLine     = errors.New("it is not a line of sums")
	errChecksum = errors.New("its checksum is wrong")
)

// parseLine reads a line with its newline.
func parseLine(line []byte) (e entry, err error) {
	if len(line) < len(lineOpen)+lineTail || !bytes.HasPrefix(line, []byte(lineOpen)) {
		return e, errLine
	}
	text, tail := line[len(lineOpen):len(line)-lineTail], line[len(line)-lineTail:]
	if want := fmt.Appendf(nil, "%s%08x%s", lineSum, crc32.Checksum(text, castagnoli), lineClose); !bytes.Equal(tail, want) {
		return e, errChecksum
	}
	dec := json.NewDecoder(bytes.NewReader(text))
	dec.DisallowUnknownFields()
	if err := dec.Decode(&e); err != nil {
		return e, fmt.Errorf("its JSON: %w", err)
	}
	return e, nil
}

// follows checks that e can come after p, which is nil for the first line, and
// that nothing in it asks for more memory than a batch.
func (e *entry) follows(p *entry, every int64) error {
	if p == nil {
		switch {
		case e.Kind != kindHeader:
			return fmt.Errorf("it is of kind %q, want %q first", e.Kind, kindHeader)
		case e.Format != format:
			return fmt.Errorf("its format is %d, this program reads %d", e.Format, format)
		}
		p = &entry{First: e.First}
	} else if e.Kind != kindStretch && e.Kind != kindEnd {
		return fmt.Errorf("it is of kind %q, want %q or %q", e.Kind, kindStretch, kindEnd)
	}
	number := p.Stretch
	if p.Kind == kindStretch {
		number++
	}
	if e.Stretch != number {
		return fmt.Errorf("it is of stretch %d, want %d", e.Stretch, number)
	}
	for _, s := range []struct {
		file    string
		is, was segment
	}{{samplesFile, e.Samples, p.Samples}, {eventsFile, e.Events, p.Events}} {
		if s.is.At != s.was.At+s.was.Bytes {
			return fmt.Errorf("its batch of %s lies at byte %d, want %d", s.file, s.is.At, s.was.At+s.was.Bytes)
		}
		if s.is.Bytes < 0 || s.is.Bytes > maxSegment || s.is.Rows < 0 || s.is.Rows > maxRows {
			return fmt.Errorf("its batch of %s has %d bytes and %d rows, at most %d and %d", s.file, s.is.Bytes, s.is.Rows, maxSegment, maxRows)
		}
		if e.Kind == kindStretch && (s.is.Bytes == 0) != (s.is.Rows == 0) {
			return fmt.Errorf("its batch of %s has %d rows in %d bytes", s.file, s.is.Rows, s.is.Bytes)
		}
	}
	if e.Kind == kindStretch {
		return e.checkTicks(p, every)
	}
	return nil
}

// checkTicks checks a stretch against the one before.
func (e *entry) checkTicks(p *entry, every int64) error {
	const far = 1 << 62 // leaves room for sums
	if e.First < -far || e.First > far || e.Ticks < 1 || e.Ticks > maxTicks {
		return fmt.Errorf("it has %d ticks from %d on, want 1 to %d of them", e.Ticks, e.First, maxTicks)
	}
	if p.Kind == kindStretch && e.First <= p.last() {
		return fmt.Errorf("it begins with tick %d, want more than %d", e.First, p.last())
	}
	if !valid(e.Initial) {
		return fmt.Errorf("its initial level is %d, want below %d", e.Initial, trace.Levels)
	}
	var sum int64
	for _, r := range e.Runs {
		if r[0] < 1 || r[0] > maxTicks || r[1] < 1 || r[1] > maxTicks {
			return fmt.Errorf("it has %d blocks of %d ticks", r[0], r[1])
		}
		sum += r[0] * r[1]
	}
	if len(e.Runs) > maxRuns || sum != e.Ticks {
		return fmt.Errorf("its blocks have %d ticks, want %d", sum, e.Ticks)
	}
	if want := kept(e.First, e.Ticks, every); e.Samples.Rows != want {
		return fmt.Errorf("it has %d samples, want %d", e.Samples.Rows, want)
	}
	return nil
}

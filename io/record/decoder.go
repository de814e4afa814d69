package record

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"io"

	"github.com/apache/arrow-go/v18/arrow"
	"github.com/apache/arrow-go/v18/arrow/ipc"
	"github.com/apache/arrow-go/v18/arrow/memory"
)

// A source is a file of a recording that is being read.
type source struct {
	name string
	size int64
	file io.ReaderAt
}

// errCut means that a file ends before a segment does.
var errCut = errors.New("the file ends before it")

// errMessage means that a segment, although its checksum holds, is not what a
// Writer writes.
var errMessage = errors.New("it is not an Arrow message of this format")

// A decoder reads the segments of a stream in order. Arrow gets a segment as
// messages whose bytes are there already, so that no length in them can ask
// for more.
type decoder struct {
	source *source
	fields []arrow.Field
	bytes  []byte // of the segment in hand, aligned to 8
	arrow  *ipc.Reader
}

// newDecoder reads the header of a stream.
func newDecoder(s *source, fields []arrow.Field, header segment) (*decoder, error) {
	d := &decoder{source: s, fields: fields}
	if err := d.read(header); err != nil {
		return nil, err
	}
	var err error
	if d.arrow, err = ipc.NewReaderFromMessageReader((*messages)(d), ipc.WithAllocator(refuser{})); err != nil {
		return nil, fmt.Errorf("%w: %w", errMessage, err)
	}
	got := d.arrow.Schema().Fields()
	if len(got) != len(fields) {
		return nil, fmt.Errorf("%w: it has %d columns, want %d", errMessage, len(got), len(fields))
	}
	for i, f := range got {
		if f.Name != fields[i].Name || !arrow.TypeEqual(f.Type, fields[i].Type) {
			return nil, fmt.Errorf("%w: column %d is %s of %s, want %s of %s", errMessage, i, f.Name, f.Type, fields[i].Name, fields[i].Type)
		}
	}
	return d, nil
}

// read gets the bytes of a segment and checks them.
func (d *decoder) read(g segment) error {
	if g.At+g.Bytes > d.source.size {
		return errCut
	}
	if int64(cap(d.bytes)) < g.Bytes {
		d.bytes = make([]byte, g.Bytes)
	}
	d.bytes = d.bytes[:g.Bytes]
	if n, err := d.source.file.ReadAt(d.bytes, g.At); n < len(d.bytes) {
		return fmt.Errorf("record: %s: %w", d.source.name, err)
	}
	if crc32.Checksum(d.bytes, castagnoli) != g.Sum {
		return errChecksum
	}
	return nil
}

// batch returns the columns of a segment, valid until the next call; nil for
// an empty one.
func (d *decoder) batch(g segment) (arrow.RecordBatch, error) {
	if g.Rows == 0 {
		return nil, nil
	}
	if err := d.read(g); err != nil {
		return nil, err
	}
	if !d.arrow.Next() {
		return nil, fmt.Errorf("%w: %v", errMessage, d.arrow.Err())
	}
	b := d.arrow.RecordBatch()
	if b.NumRows() != g.Rows {
		return nil, fmt.Errorf("%w: it has %d rows, want %d", errMessage, b.NumRows(), g.Rows)
	}
	for i, c := range b.Columns() {
		if n := c.NullN(); n != 0 && (!d.fields[i].Nullable || n != c.Len()) {
			return nil, fmt.Errorf("%w: %d of %d values of %s are null", errMessage, n, c.Len(), d.fields[i].Name)
		}
	}
	return b, nil
}

// messages is a decoder as Arrow sees it: the segment in hand as a message.
type messages decoder

// Message may panic on bytes that are none; Arrow's reader recovers.
func (m *messages) Message() (*ipc.Message, error) {
	const prefix = 8 // a mark and the length of the metadata
	b := m.bytes
	if len(b) < prefix || binary.LittleEndian.Uint32(b) != 0xffffffff {
		return nil, errMessage
	}
	length := int64(binary.LittleEndian.Uint32(b[4:]))
	if length == 0 || length%8 != 0 || length > int64(len(b)-prefix) {
		return nil, errMessage
	}
	return ipc.NewMessage(memory.NewBufferBytes(b[prefix:prefix+length]), memory.NewBufferBytes(b[prefix+length:])), nil
}

func (*messages) Retain()  {}
func (*messages) Release() {}

// A refuser gives Arrow no memory: what we write needs none to be read.
type refuser struct{}

func (refuser) Allocate(int) []byte           { panic("record: a batch that needs memory") }
func (refuser) Reallocate(int, []byte) []byte { panic("record: a batch that needs memory") }
func (refuser) Free([]byte)                   {}

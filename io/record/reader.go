package record

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
)

// A Reader reads a recording. It must be made by Open and closed, and must not
// be used by two goroutines at once. It holds one batch of either stream, and
// some 200 bytes for each batch of the recording.
type Reader struct {
	head    Header
	samples source
	events  source
	files   []io.Closer

	header  entry
	entries []entry      // of stretches, as far as they are whole
	end     *entry       // nil where there is none
	damage  *DamageError // of the sums, after entries
}

// Open opens a recording. A recording that was cut or damaged opens as long as
// its header is whole; what gives its content says so in time. Errors are
// ErrCutInHeader, a DamageError of the header, or the system's.
func Open(dir string) (*Reader, error) {
	var opened []io.Closer
	sources := map[string]source{}
	r, err := func() (*Reader, error) {
		for _, name := range []string{sumsFile, samplesFile, eventsFile} {
			f, err := os.Open(filepath.Join(dir, name))
			if errors.Is(err, fs.ErrNotExist) {
				return nil, fmt.Errorf("record: %s holds no recording, or not all of it: %w", dir, err)
			} else if err != nil {
				return nil, fmt.Errorf("record: %w", err)
			}
			opened = append(opened, f)
			info, err := f.Stat()
			if err != nil {
				return nil, fmt.Errorf("record: %w", err)
			}
			sources[name] = source{name: name, size: info.Size(), file: f}
		}
		return open(sources[samplesFile], sources[eventsFile], sources[sumsFile])
	}()
	if err != nil {
		for _, f := range opened {
			_ = f.Close()
		}
		return nil, err
	}
	r.files = opened
	return r, nil
}

// Header returns what the recording is of.
func (r *Reader) Header() Header { return r.head }

// Close closes the files.
func (r *Reader) Close() error {
	var errs []error
	for _, f := range r.files {
		errs = append(errs, f.Close())
	}
	r.files = nil
	return errors.Join(errs...)
}

func open(samples, events, sums source) (*Reader, error) {
	r := &Reader{samples: samples, events: events}
	lines := bufio.NewReaderSize(io.NewSectionReader(sums.file, 0, sums.size), maxLine)
	first, err := nextLine(lines)
	if err == nil {
		r.header = first
		err = first.follows(nil, 1)
	}
	switch {
	case errors.Is(err, io.EOF):
		return nil, ErrCutInHeader
	case err != nil:
		return nil, &DamageError{File: sumsFile, Batch: -1, Err: err}
	}
	if err := r.readHeader(); err != nil {
		return nil, err
	}
	return r, r.readSums(lines)
}

// readHeader takes the header from the samples or, where those were cut before
// it, from the events.
func (r *Reader) readHeader() error {
	d, err := newDecoder(&r.samples, sampleFields, r.header.Samples)
	if errors.Is(err, errCut) {
		d, err = newDecoder(&r.events, eventFields, r.header.Events)
		if errors.Is(err, errCut) {
			return ErrCutInHeader
		}
		if err != nil {
			return damageOf(eventsFile, nil, err)
		}
	}
	if err != nil {
		return damageOf(samplesFile, nil, err)
	}
	r.head, err = parseHeader(d.arrow.Schema().Metadata())
	return err
}

// readSums reads the entries of stretches and the end mark.
func (r *Reader) readSums(lines *bufio.Reader) error {
	last := &r.header
	for {
		e, err := nextLine(lines)
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err == nil && last.Kind == kindEnd {
			err = errors.New("it comes after the end mark")
		}
		if err == nil {
			err = e.follows(last, r.head.Every)
		}
		var pathError *fs.PathError
		if errors.As(err, &pathError) {
			return fmt.Errorf("record: %w", err)
		}
		if err != nil {
			next := last.First + last.Ticks
			r.damage = &DamageError{File: sumsFile, Batch: int64(len(r.entries)), First: next, Last: next - 1, Err: err}
			return nil
		}
		if last = &e; e.Kind == kindEnd {
			r.end = &e
		} else {
			r.entries = append(r.entries, e)
		}
	}
}

// nextLine reads an entry. It returns io.EOF at the end and for a last line
// that was cut.
func nextLine(lines *bufio.Reader) (entry, error) {
	line, err := lines.ReadSlice('\n')
	switch {
	case err == nil:
		return parseLine(line)
	case errors.Is(err, bufio.ErrBufferFull):
		return entry{}, fmt.Errorf("it has more than %d bytes", maxLine)
	case !errors.Is(err, io.EOF):
		return entry{}, err
	}
	// A whole line without its newline, and one more byte, was not cut: its
	// newline was changed.
	if n := len(line); n > 0 {
		if _, err := parseLine(append(line[:n-1:n-1], '\n')); err == nil {
			return entry{}, errLine
		}
	}
	return entry{}, io.EOF
}

// damageOf says which batch is damaged; e is nil for a header. Errors of the
// system, and cuts, stay what they are.
func damageOf(file string, e *entry, err error) error {
	if !errors.Is(err, errChecksum) && !errors.Is(err, errMessage) && !errors.Is(err, errContent) {
		return err
	}
	d := &DamageError{File: file, Batch: -1, Err: err}
	if e != nil {
		d.Batch, d.First, d.Last = e.Stretch, e.First, e.last()
	}
	return d
}

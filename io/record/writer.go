package record

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sync/atomic"

	"brinkwell/controller/trace"
)

// A file is what a Writer needs of a file.
type file interface {
	Write(p []byte) (int, error)
	Sync() error
	Close() error
}

// buffers is how many stretches there are: one is filled while the other is
// written.
const buffers = 2

// A Writer is a sink that records what it takes. It must be made by Create and
// closed, and must not be used by two goroutines at once.
//
// A goroutine of its own writes one stretch while the next is gathered. When
// it is behind, Take waits: nothing is dropped.
type Writer struct {
	head   Header
	disk   *disk
	filled *stretch

	begun, closed bool
	next          int64       // tick
	force         trace.Level // after the events seen so far

	full, free chan *stretch
	done       chan struct{}
	failed     atomic.Pointer[WriteError]
}

// Create begins a recording in a directory, which it makes if need be. It
// refuses one that holds a recording.
func Create(dir string, h Header) (*Writer, error) {
	if err := h.validate(); err != nil {
		return nil, err
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, fmt.Errorf("record: %w", err)
	}
	for _, name := range []string{samplesFile, eventsFile, sumsFile} {
		if _, err := os.Lstat(filepath.Join(dir, name)); err == nil {
			return nil, fmt.Errorf("record: %s already holds a recording: it has %s", dir, name)
		} else if !errors.Is(err, fs.ErrNotExist) {
			return nil, fmt.Errorf("record: %w", err)
		}
	}
	return create(h, func(name string) (file, error) {
		return os.OpenFile(filepath.Join(dir, name), os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	})
}

func create(h Header, open func(name string) (file, error)) (*Writer, error) {
	d, err := newDisk(open)
	if err != nil {
		return nil, err
	}
	w := &Writer{
		head: h,
		disk: d,
		full: make(chan *stretch, buffers),
		free: make(chan *stretch, buffers),
		done: make(chan struct{}),
	}
	return w, nil
}

// Take records a block. Its Start may leave a gap to the block before, which a
// Reader then shows; it may not go back. After an error, which is a WriteError
// where a file failed, Take records nothing more. It panics after Close.
func (w *Writer) Take(b *trace.Block) error {
	if w.closed {
		panic("record: Take after Close")
	}
	if err := w.failed.Load(); err != nil {
		return err
	}
	if err := w.check(b); err != nil {
		return err
	}
	if !w.begun {
		w.head.First, w.head.Initial = b.Start, b.Initial
		if err := w.begin(); err != nil {
			return err
		}
	}
	if s := w.filled; s.ticks > 0 && (b.Start != w.next || b.Initial != w.force || !s.fits(b)) {
		w.handOver()
	}
	if err := w.filled.add(b); err != nil {
		return err
	}
	w.next, w.force = b.Start+int64(len(b.Samples)), b.Initial
	if k := len(b.Events); k > 0 {
		w.force = b.Events[k-1].Level
	}
	if w.filled.isFull() {
		w.handOver()
	}
	return nil
}

// check refuses blocks that no Reader could give back.
func (w *Writer) check(b *trace.Block) error {
	switch {
	case len(b.Samples) == 0:
		return fmt.Errorf("record: the block at tick %d has no samples", b.Start)
	case len(b.Samples) > maxRows || len(b.Events) > maxRows:
		return fmt.Errorf("record: the block at tick %d has %d samples and %d events, at most %d of either", b.Start, len(b.Samples), len(b.Events), maxRows)
	case b.Truth != w.head.Truth:
		return fmt.Errorf("record: whether the truth is known is %t in the block at tick %d and %t in the header", b.Truth, b.Start, w.head.Truth)
	case !valid(b.Initial):
		return fmt.Errorf("record: the block at tick %d has initial level %d, want below %d", b.Start, b.Initial, trace.Levels)
	case w.begun && b.Start < w.next:
		return fmt.Errorf("record: the block at tick %d comes after tick %d", b.Start, w.next-1)
	}
	return nil
}

// begin writes the headers and starts the goroutine.
func (w *Writer) begin() error {
	w.begun = true
	if err := w.disk.begin(w.head); err != nil {
		w.failed.Store(err)
		return err
	}
	w.filled = newStretch(&w.head)
	for range buffers - 1 {
		w.free <- newStretch(&w.head)
	}
	go func() {
		defer close(w.done)
		for s := range w.full {
			if w.failed.Load() == nil {
				if err := w.disk.write(s); err != nil {
					w.failed.Store(err)
				}
			}
			s.reset()
			w.free <- s
		}
	}()
	return nil
}

// handOver gives the stretch to the goroutine and waits for an empty one.
func (w *Writer) handOver() {
	w.full <- w.filled
	w.filled = <-w.free
}

// Close writes what is left and the end mark, and waits until all of it is on
// the disk. A recording that could not be written is closed too, and the error
// of that is returned.
func (w *Writer) Close() error {
	if !w.closed {
		w.closed = true
		w.finish()
	}
	if err := w.failed.Load(); err != nil {
		return err
	}
	return nil
}

func (w *Writer) finish() {
	if !w.begun {
		if w.begin() != nil { // a recording of nothing
			w.disk.close()
			return
		}
	}
	if w.filled != nil {
		if w.filled.ticks > 0 {
			w.full <- w.filled
		}
		close(w.full)
		<-w.done
	}
	if w.failed.Load() == nil {
		if err := w.disk.end(); err != nil {
			w.failed.Store(err)
		}
	}
	if err := w.disk.close(); err != nil {
		w.failed.CompareAndSwap(nil, err)
	}
}

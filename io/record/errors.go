package record

import (
	"errors"
	"fmt"
)

// ErrDecimated means that blocks were asked of a recording that does not hold
// every tick.
var ErrDecimated = errors.New("record: blocks need every tick")

// ErrCutInHeader means that a recording was cut off before its header was
// whole: there is nothing to read.
var ErrCutInHeader = errors.New("record: the recording ends within its header")

// A DamageError says which part of a recording is not what was written.
type DamageError struct {
	File        string
	Batch       int64 // number of the batch in its stretch's order, or -1 for a stream's header
	First, Last int64 // its ticks; Last < First where not known how far it goes
	Err         error // what is wrong
}

func (e *DamageError) Error() string {
	where := fmt.Sprintf("batch %d (ticks %d to %d)", e.Batch, e.First, e.Last)
	switch {
	case e.Batch < 0:
		where = "the header"
	case e.Last < e.First:
		where = fmt.Sprintf("batch %d (ticks from %d on)", e.Batch, e.First)
	}
	if e.File == sumsFile {
		where = "the entry of " + where
	}
	return fmt.Sprintf("record: %s: %s is damaged: %v", e.File, where, e.Err)
}

func (e *DamageError) Unwrap() error { return e.Err }

// A WriteError says what of a recording is whole although it could not be
// written on.
type WriteError struct {
	File  string
	Ticks int64 // that can be read back, since the first
	Err   error
}

func (e *WriteError) Error() string {
	return fmt.Sprintf("record: %s: %v; the first %d ticks can be read", e.File, e.Err, e.Ticks)
}

func (e *WriteError) Unwrap() error { return e.Err }

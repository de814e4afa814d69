package estimate

import (
	"fmt"

	"gonum.org/v1/gonum/floats"
)

// Batches keeps rows of sums over consecutive stretches of a run in constant
// memory: when there are twice as many rows as wanted, neighbours are added
// and a stretch becomes twice as long. A row holds whatever sums its user
// books: counts, moments, a histogram.
//
// It must be made by NewBatches and must not be used by two goroutines at
// once.
type Batches struct {
	rows   [][]float64
	spare  [][]float64 // rows to use again
	width  int
	most   int
	length int64 // ticks a full row
	open   int64 // ticks in the open row, the last of rows
}

// NewBatches makes Batches of the given number of sums a row, that keep
// between wanted and twice wanted rows of at least length ticks. It panics if
// an argument is not positive.
func NewBatches(width, wanted int, length int64) *Batches {
	if width < 1 || wanted < 1 || length < 1 {
		panic("estimate: batches need a positive width, number and length")
	}
	b := &Batches{width: width, most: 2 * wanted, length: length}
	b.begin()
	return b
}

func (b *Batches) begin() {
	var row []float64
	if n := len(b.spare); n > 0 {
		row, b.spare = b.spare[n-1], b.spare[:n-1]
		clear(row)
	} else {
		row = make([]float64, b.width)
	}
	b.rows, b.open = append(b.rows, row), 0
}

// Row returns the open row, to add to.
func (b *Batches) Row() []float64 { return b.rows[len(b.rows)-1] }

// Room returns how many ticks the open row still takes: at least one.
func (b *Batches) Room() int64 { return b.length - b.open }

// Advance says that n ticks were booked in the open row. It panics if n
// exceeds Room.
func (b *Batches) Advance(n int64) {
	if n < 0 || n > b.Room() {
		panic(fmt.Sprintf("estimate: %d ticks in a row with room for %d", n, b.Room()))
	}
	b.open += n
	if b.open < b.length {
		return
	}
	if len(b.rows) == b.most {
		b.fold()
	}
	b.begin()
}

// fold adds neighbouring rows.
func (b *Batches) fold() {
	for i := range b.most / 2 {
		floats.Add(b.rows[2*i], b.rows[2*i+1])
		b.rows[i], b.spare = b.rows[2*i], append(b.spare, b.rows[2*i+1])
	}
	b.rows = b.rows[:b.most/2]
	b.length *= 2
}

// Rows returns the rows booked so far, oldest first. An open row that is less
// than half full is added to the one before it. The rows belong to b and hold
// until its next Advance.
func (b *Batches) Rows() [][]float64 {
	last := len(b.rows) - 1
	switch {
	case 2*b.open >= b.length:
		return b.rows
	case last == 0:
		if b.open == 0 {
			return nil
		}
		return b.rows
	}
	rows := append([][]float64(nil), b.rows[:last]...)
	joined := append([]float64(nil), rows[last-1]...)
	floats.Add(joined, b.rows[last])
	rows[last-1] = joined
	return rows
}

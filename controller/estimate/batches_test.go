package estimate

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// Whatever the run's length, the rows hold every tick once, in order, in
// stretches of one length but for the last, and their number stays bounded.
func TestBatchesKeepEverything(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		wanted := rapid.IntRange(1, 20).Draw(t, "wanted")
		length := rapid.Int64Range(1, 5).Draw(t, "length")
		ticks := rapid.Int64Range(0, 2000).Draw(t, "ticks")
		b := NewBatches(2, wanted, length)
		for tick := int64(0); tick < ticks; {
			n := min(b.Room(), ticks-tick, rapid.Int64Range(1, 50).Draw(t, "step"))
			for range n {
				b.Row()[0]++
				b.Row()[1] += float64(tick)
				tick++
			}
			b.Advance(n)
		}
		rows := b.Rows()
		if len(rows) > 2*wanted+1 {
			t.Fatalf("%d rows, want at most %d", len(rows), 2*wanted+1)
		}
		next := 0.0
		for i, row := range rows {
			n := row[0]
			// Ticks next … next+n-1 add up to this.
			if want := n*next + n*(n-1)/2; row[1] != want {
				t.Fatalf("row %d sums ticks to %v, want %v", i, row[1], want)
			}
			if i < len(rows)-1 && n != rows[0][0] {
				t.Fatalf("row %d has %v ticks, the first %v", i, n, rows[0][0])
			}
			next += n
		}
		if int64(next) != ticks {
			t.Fatalf("the rows hold %v ticks, want %d", next, ticks)
		}
	})
}

// Of a function that is linear in the sums the jackknife is the mean itself;
// of a mean's square it removes the bias, the variance of the mean, exactly
// (M.H. Quenouille, Biometrika 43, 353 (1956)).
func TestJackknifeRemovesBias(t *testing.T) {
	rows := make([][]float64, 32)
	var sum, square float64
	for i := range rows {
		x := math.Sin(1 + float64(i)*float64(i)) // scattered, not random
		rows[i] = []float64{1, x}
		sum += x
		square += x * x
	}
	n := float64(len(rows))
	mean := sum / n
	variance := (square - n*mean*mean) / (n - 1)
	v := Jackknife(rows, 3, func(dst, s []float64) {
		dst[0] = s[1] / s[0]
		dst[1] = dst[0] * dst[0]
		dst[2] = math.NaN()
	})
	if !within(v[0].Value, mean, 1e-14) || !within(v[1].Value, mean*mean-variance/n, 1e-14) {
		t.Errorf("got %v and %v, want %v and %v", v[0].Value, v[1].Value, mean, mean*mean-variance/n)
	}
	if v[2].Known() {
		t.Errorf("a quantity that is not a number is %v, want none", v[2])
	}
}

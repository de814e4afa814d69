package estimate

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
)

// A Function computes quantities from sums over a run and writes them to dst.
// A quantity that these sums do not give is NaN. It must not keep sums.
type Function func(dst, sums []float64)

// Totals adds the rows up. It returns nil where there are none.
func Totals(rows [][]float64) []float64 {
	if len(rows) == 0 {
		return nil
	}
	total := append([]float64(nil), rows[0]...)
	for _, row := range rows[1:] {
		floats.Add(total, row)
	}
	return total
}

// Jackknife returns the estimates of n quantities that are functions of sums
// over a run, rows being the sums over its consecutive stretches: the value
// with its bias of order 1/len(rows) removed, and the interval that the
// scatter and the correlation of the delete-one pseudo-values give (M.H.
// Quenouille, Biometrika 43, 353 (1956); J.W. Tukey, Ann. Math. Stat. 29, 614
// (1958); see Mean for the correlation). It calls f once more than there are
// rows.
func Jackknife(rows [][]float64, n int, f Function) []Value {
	values := make([]Value, n)
	if len(rows) < fewestBlocks {
		for k := range values {
			values[k] = tooFew(len(rows))
		}
		return values
	}
	whole, part := make([]float64, n), make([]float64, n)
	total := Totals(rows)
	f(whole, total)

	pseudo := make([][]float64, n)
	for k := range pseudo {
		pseudo[k] = make([]float64, len(rows))
	}
	rest := make([]float64, len(total))
	count := float64(len(rows))
	for i, row := range rows {
		floats.SubTo(rest, total, row)
		f(part, rest)
		for k := range pseudo {
			pseudo[k][i] = count*whole[k] - (count-1)*part[k]
		}
	}
	for k := range values {
		values[k] = jackknifed(whole[k], pseudo[k])
	}
	return values
}

func jackknifed(whole float64, pseudo []float64) Value {
	if math.IsNaN(whole) || math.IsInf(whole, 0) {
		return Unknown("the run does not give it")
	}
	for _, p := range pseudo {
		if math.IsNaN(p) || math.IsInf(p, 0) {
			return Unknown("it rests on one short stretch of the run alone")
		}
	}
	if slices.Min(pseudo) == slices.Max(pseudo) {
		return Unknown("it did not vary over the run, which gives no interval")
	}
	return Mean(pseudo)
}

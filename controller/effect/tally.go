package effect

import (
	"math"

	"brinkwell/controller/trace"
)

// binsPerSigma makes bins so fine that the rounding of the cusp by an
// ordinary loop, some tenths of sigma, is resolved.
const binsPerSigma = 50

// A scale says how positions are binned: by their distance from the
// threshold, in bins of sigma/50, the threshold on a border.
type scale struct {
	threshold float64 // m
	perMetre  float64 // bins a metre
	bins      int     // with one at either end for what lies beyond
	half      int     // index of the first bin above the threshold
}

func newScale(r Reference) scale {
	sigma := r.sigma()
	reach := (r.HalfDistance+math.Abs(r.Threshold))/sigma + 8
	half := int(math.Ceil(reach*binsPerSigma)) + 1
	return scale{threshold: r.Threshold, perMetre: binsPerSigma / sigma, bins: 2 * half, half: half}
}

// Moments of the distance d from the threshold: Σ|d|, Σd, Σd², Σd·|d|.
const (
	momentAbs = iota
	momentSum
	momentSquare
	momentSigned
	momentSums
)

// A tally keeps moments and histogram of a stretch.
type tally struct {
	scale  scale
	moment [momentSums]float64
	counts []int64
}

func newTally(s scale) tally { return tally{scale: s, counts: make([]int64, s.bins)} }

// tallyBoth adds true and measured positions to their tallies and returns the
// sum of the squared velocities, m²/s².
//
// One pass over both lets their chains of additions overlap; the sums are
// plain variables, since an array would live in memory.
func tallyBoth(position, measured *tally, samples []trace.Sample) (velocity2 float64) {
	x0, per, half := position.scale.threshold, position.scale.perMetre, float64(position.scale.half)
	trueCounts, seenCounts := position.counts, measured.counts
	var sumAbs, sum, square, signed float64
	var seenAbs, seen, seenSquare, seenSigned float64
	for i := range samples {
		s := &samples[i]
		velocity2 += s.Velocity * s.Velocity

		d := s.Position - x0
		a := math.Abs(d)
		sumAbs += a
		sum += d
		square += d * d
		signed += d * a
		trueCounts[bin(d*per+half, len(trueCounts))]++

		d = s.Measured - x0
		a = math.Abs(d)
		seenAbs += a
		seen += d
		seenSquare += d * d
		seenSigned += d * a
		seenCounts[bin(d*per+half, len(seenCounts))]++
	}
	position.add(sumAbs, sum, square, signed)
	measured.add(seenAbs, seen, seenSquare, seenSigned)
	return velocity2
}

// tallyMeasured adds the measured positions alone; lost ones, which are no
// numbers, are left out.
func (t *tally) tallyMeasured(samples []trace.Sample) {
	t.tallyOne(samples, func(s *trace.Sample) float64 { return s.Measured })
}

// tallyTrue adds the true positions alone and returns the sum of the squared
// velocities, m²/s².
func (t *tally) tallyTrue(samples []trace.Sample) (velocity2 float64) {
	t.tallyOne(samples, func(s *trace.Sample) float64 { return s.Position })
	for i := range samples {
		velocity2 += samples[i].Velocity * samples[i].Velocity
	}
	return velocity2
}

func (t *tally) tallyOne(samples []trace.Sample, of func(*trace.Sample) float64) {
	counts, x0, per, half := t.counts, t.scale.threshold, t.scale.perMetre, float64(t.scale.half)
	var sumAbs, sum, square, signed float64
	for i := range samples {
		d := of(&samples[i]) - x0
		if math.IsNaN(d) {
			continue
		}
		a := math.Abs(d)
		sumAbs += a
		sum += d
		square += d * d
		signed += d * a
		counts[bin(d*per+half, len(counts))]++
	}
	t.add(sumAbs, sum, square, signed)
}

func (t *tally) add(sumAbs, sum, square, signed float64) {
	t.moment[momentAbs] += sumAbs
	t.moment[momentSum] += sum
	t.moment[momentSquare] += square
	t.moment[momentSigned] += signed
}

// bin returns the bin of a scaled position; what lies outside, or is no
// number, goes to the bins at the ends.
func bin(u float64, bins int) int {
	if k := int(u); uint(k) < uint(bins) {
		return k
	}
	if u > 0 {
		return bins - 1
	}
	return 0
}

// flush adds the tally to a row of momentSums + bins sums and empties it.
func (t *tally) flush(row []float64) {
	for k, v := range t.moment {
		row[k] += v
	}
	t.moment = [momentSums]float64{}
	for k, n := range t.counts {
		row[momentSums+k] += float64(n)
	}
	clear(t.counts)
}

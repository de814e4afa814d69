package effect

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"brinkwell/controller/estimate"
)

// A Difference is what another bench shows more than a first one, quantity by
// quantity.
type Difference struct {
	Realised  Landscape // without a curve
	Crossings Crossings // without counts, latency and measured values
	Identity  Identity  // its two sides; their difference is not compared
	// Paired says that the runs were compared stretch by stretch, which takes
	// out of the intervals what the same random numbers did to both.
	Paired bool
}

// Differences compares two observers of runs of one length: b less a. Runs of
// the same number of ticks are compared stretch by stretch, others as
// independent.
func Differences(a, b *Observer) Difference {
	rowsA, rowsB := a.ended(), b.ended()
	ra, rb := a.Result(), b.Result()
	if ra.Ticks != rb.Ticks || len(rowsA) != len(rowsB) || a.ref.Rate != b.ref.Rate || !a.truth || !b.truth {
		return independent(ra, rb)
	}
	readA, readB := newReader(a, estimate.Totals(rowsA), false), newReader(b, estimate.Totals(rowsB), false)
	split := len(a.batches.Row())
	joined := make([][]float64, len(rowsA))
	for i := range joined {
		joined[i] = append(append([]float64(nil), rowsA[i]...), rowsB[i]...)
	}
	n := curve + crossingQuantities
	one, other := make([]float64, max(readA.quantities(), readB.quantities())), make([]float64, crossingQuantities)
	v := estimate.Jackknife(joined, n, func(dst, sums []float64) {
		sign := -1.0
		clear(dst)
		for k, r := range []*reader{readA, readB} {
			part := sums[:split]
			if k == 1 {
				part, sign = sums[split:], 1
			}
			r.read(one[:r.quantities()], part)
			[]*Observer{a, b}[k].crossingsOf(other, part)
			for i := range curve {
				dst[i] += sign * one[i]
			}
			for i, x := range other {
				dst[curve+i] += sign * x
			}
		}
	})
	d := Difference{Realised: arrange(v[:curve]), Paired: true}
	c := v[curve:]
	d.Crossings = Crossings{
		Rate: c[rawRate], SettledRate: c[settledRate], MeanDwell: c[meanDwell],
		Overshoot: c[overshoot], Energy: c[energy], Power: c[power], ChatterFraction: c[chatter],
	}
	copy(d.Crossings.MeanDwells[:], c[perLevel:])
	copy(d.Crossings.RawDwells[:], c[perLevel+len(d.Crossings.MeanDwells):])
	d.Identity = Identity{Kinetic: c[balanceKinetic], FromPower: c[balancePower]}
	return d
}

// independent compares two results whose runs cannot be paired.
func independent(a, b Result) Difference {
	x, y := a.Realised, b.Realised
	p, q := a.Crossings, b.Crossings
	var d Difference
	d.Realised = Landscape{
		Barrier: less(x.Barrier, y.Barrier), BarrierFromParabolas: less(x.BarrierFromParabolas, y.BarrierFromParabolas),
		Distance: less(x.Distance, y.Distance), Stiffness: less(x.Stiffness, y.Stiffness), Tilt: less(x.Tilt, y.Tilt),
		KineticTemperature: less(x.KineticTemperature, y.KineticTemperature), WidthTemperature: less(x.WidthTemperature, y.WidthTemperature),
		MeanAbsPosition: less(x.MeanAbsPosition, y.MeanAbsPosition), DensityAtThreshold: less(x.DensityAtThreshold, y.DensityAtThreshold),
		UpperShare: less(x.UpperShare, y.UpperShare),
	}
	d.Crossings = Crossings{
		Rate: less(p.Rate, q.Rate), SettledRate: less(p.SettledRate, q.SettledRate), MeanDwell: less(p.MeanDwell, q.MeanDwell),
		Overshoot: less(p.Overshoot, q.Overshoot), Energy: less(p.Energy, q.Energy), Power: less(p.Power, q.Power),
		ChatterFraction: less(p.ChatterFraction, q.ChatterFraction),
	}
	for i := range x.Barriers {
		d.Realised.Barriers[i] = less(x.Barriers[i], y.Barriers[i])
		d.Realised.Centres[i] = less(x.Centres[i], y.Centres[i])
		d.Realised.Stiffnesses[i] = less(x.Stiffnesses[i], y.Stiffnesses[i])
		d.Crossings.MeanDwells[i] = less(p.MeanDwells[i], q.MeanDwells[i])
		d.Crossings.RawDwells[i] = less(p.RawDwells[i], q.RawDwells[i])
	}
	d.Identity = Identity{Kinetic: less(a.Identity.Kinetic, b.Identity.Kinetic), FromPower: less(a.Identity.FromPower, b.Identity.FromPower)}
	return d
}

// less returns b less a, of independent estimates: their intervals add in
// squares, each end's with the other's opposite one.
func less(a, b estimate.Value) estimate.Value {
	switch {
	case !a.Known():
		return a
	case !b.Known():
		return b
	}
	v := estimate.Value{Value: b.Value - a.Value}
	v.Low = v.Value - math.Hypot(b.Value-b.Low, a.High-a.Value)
	v.High = v.Value + math.Hypot(b.High-b.Value, a.Value-a.Low)
	return v
}

// sigmas returns how many standard errors an estimate is from 0, by its
// interval as if it were normal.
func sigmas(v estimate.Value) float64 {
	if !v.Known() || v.Half() == 0 {
		return 0
	}
	return v.Value / (v.Half() / distuv.UnitNormal.Quantile((1+estimate.Confidence)/2))
}

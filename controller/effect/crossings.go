package effect

import (
	"math"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trace"
)

// Order of the quantities that crossingsOf computes.
const (
	rawRate = iota
	settledRate
	meanDwell
	overshoot
	energy
	power
	chatter
	seenOvershoot
	balanceKinetic
	balancePower
	balance
	perLevel
	crossingQuantities = perLevel + 2*trace.Levels
)

// crossingsOf is the estimate.Function of the crossings and of the energy
// balance, which needs the two sides of it from the same part of the run.
func (o *Observer) crossingsOf(dst, row []float64) {
	for k := range dst {
		dst[k] = math.NaN()
	}
	osc := o.ref.Oscillator
	seconds := row[sumTicks] / o.ref.Rate
	if seconds == 0 {
		return
	}
	raw := row[sumActuations]
	var settled, dwell float64
	for level := range trace.Levels {
		settled += row[sumSettled+level]
		dwell += row[sumDwell+level]
		dst[perLevel+level] = ratio(row[sumDwell+level], row[sumSettled+level])
		dst[perLevel+trace.Levels+level] = ratio(row[sumRawDwell+level], row[sumRaw+level])
	}
	dst[rawRate], dst[settledRate] = raw/seconds, settled/seconds
	dst[meanDwell] = ratio(dwell, settled)
	dst[chatter] = 1 - ratio(settled, raw)
	dst[seenOvershoot] = ratio(row[sumSeenOver], raw)
	if !o.truth {
		return
	}
	dst[overshoot] = ratio(row[sumOvershoot], raw)
	dst[energy] = ratio(row[sumWork], raw) / osc.KT
	dst[power] = row[sumWork] / seconds / osc.KT
	dst[balanceKinetic] = row[sumVelocity2] / row[sumTicks] * osc.Mass() / osc.KT
	dst[balancePower] = 1 + dst[power]/osc.Damping()
	dst[balance] = dst[balanceKinetic] - dst[balancePower]
}

// ratio is a/b, or not a number where b is 0.
func ratio(a, b float64) float64 {
	if b == 0 {
		return math.NaN()
	}
	return a / b
}

// crossings estimates what the actuations show, and the energy balance.
func (o *Observer) crossings(rows [][]float64, total []float64) (Crossings, Identity) {
	whole := append([]float64(nil), total...)
	o.transitions.finish(whole)
	plain := make([]float64, crossingQuantities)
	o.crossingsOf(plain, whole)
	v := estimate.Jackknife(rows, crossingQuantities, o.crossingsOf)

	raw := int64(whole[sumActuations])
	settledOf := [trace.Levels]int64{}
	var settled int64
	for level := range settledOf {
		settledOf[level] = int64(whole[sumSettled+level])
		settled += settledOf[level]
	}
	if raw < fewestEvents {
		for _, k := range []int{meanDwell, overshoot, energy, chatter, seenOvershoot} {
			v[k] = estimate.Unknown("only %d actuations in the run", raw)
		}
	}
	if raw == 0 {
		for _, k := range []int{power, balancePower} {
			v[k] = estimate.Unknown("no actuation in the run")
		}
	}
	seconds := whole[sumTicks] / o.ref.Rate
	c := Crossings{
		Count: raw, Rate: counted(v[rawRate], raw, seconds), SettledCount: settled, SettledRate: counted(v[settledRate], settled, seconds),
		MeanDwell: dwell(v[meanDwell], plain[meanDwell], settled),
		Overshoot: v[overshoot], Energy: v[energy], Power: v[power], ChatterFraction: clamp(v[chatter], 0, 1),
		MeasuredOvershoot: v[seenOvershoot],
	}
	for level := range settledOf {
		c.MeanDwells[level] = dwell(v[perLevel+level], plain[perLevel+level], settledOf[level])
		k := perLevel + trace.Levels + level
		c.RawDwells[level] = dwell(v[k], plain[k], int64(whole[sumRaw+level]))
	}
	if raw > 0 {
		h := o.latencies
		c.Latency = Latency{
			Mean:   whole[sumLatency] / float64(raw),
			Median: float64(h.ValueAtQuantile(50)) * latencyUnit,
			P99:    float64(h.ValueAtQuantile(99)) * latencyUnit,
			Max:    float64(h.Max()) * latencyUnit,
		}
	}
	work := -2 * o.ref.Oscillator.Stiffness * o.ref.HalfDistance / o.ref.Oscillator.KT // of an overshoot of 1 m, kT
	c.MeasuredEnergy = c.MeasuredOvershoot.Scale(work)
	c.MeasuredPower = c.MeasuredEnergy.Scale(float64(raw) / seconds)
	return c, identity(v)
}

// counted returns the estimate of a rate with an interval no narrower than
// that of independent events: few of them scatter more than a short run shows.
func counted(v estimate.Value, count int64, seconds float64) estimate.Value {
	if seconds == 0 {
		return v
	}
	poisson := estimate.Poisson(count).Scale(1 / seconds)
	if !v.Known() || count < fewestEvents {
		return poisson
	}
	return estimate.Value{Value: poisson.Value, Low: math.Max(0, v.Low), High: v.High}.Widest(poisson)
}

// dwell returns the estimate of a mean dwell time: time over departures, the
// interval no narrower than that of exponential dwells.
func dwell(v estimate.Value, plain float64, count int64) estimate.Value {
	if count < fewestSwitches {
		return estimate.Unknown("only %d departures in the run", count)
	}
	n := estimate.Poisson(count)
	exponential := estimate.Value{Value: plain, Low: plain * n.Value / n.High, High: plain * n.Value / n.Low}
	if !v.Known() || count < fewestEvents {
		return exponential
	}
	shift := plain - v.Value // the time that the end of the run cut off
	return estimate.Value{Value: plain, Low: math.Max(0, v.Low+shift), High: v.High + shift}.Widest(exponential)
}

func clamp(v estimate.Value, low, high float64) estimate.Value {
	if v.Known() {
		v.Value = math.Min(math.Max(v.Value, low), high)
		v.Low = math.Min(math.Max(v.Low, low), high)
		v.High = math.Min(math.Max(v.High, low), high)
	}
	return v
}

func identity(v []estimate.Value) Identity {
	i := Identity{Kinetic: v[balanceKinetic], FromPower: v[balancePower], Difference: v[balance]}
	i.Sigmas = sigmas(i.Difference)
	return i
}

package effect

import (
	"fmt"
	"math"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trace"
)

// Crossings is what the actuations of a run show. Per-level values are indexed
// by trace.Level.
type Crossings struct {
	Count             int64          // actuations of a new level
	Rate              estimate.Value // of them, 1/s
	SettledCount      int64
	SettledRate       estimate.Value               // settled transitions, 1/s
	MeanDwell         estimate.Value               // between settled transitions, s
	MeanDwells        [trace.Levels]estimate.Value // the same on either side, s
	RawDwells         [trace.Levels]estimate.Value // between actuations, s
	Overshoot         estimate.Value               // s·(x - threshold) at the actuation, m
	Energy            estimate.Value               // U_new - U_old at an actuation, kT
	Power             estimate.Value               // the loop's, into the resonator, kT/s
	ChatterFraction   estimate.Value               // share of actuations that did not settle
	Latency           Latency
	MeasuredOvershoot estimate.Value // Overshoot by measured positions, m
	MeasuredEnergy    estimate.Value // Energy by measured positions, kT
	MeasuredPower     estimate.Value // Power by measured positions, kT/s
}

// A Latency is how long after their samples actuations were, s; 0 without
// actuations. Its percentiles are known to three digits.
type Latency struct{ Mean, Median, P99, Max float64 }

// An Identity is the stationary energy balance of a thermal oscillator and
// the loop: T_kin/T = 1 + Q·P/(omega0·kT), whatever the potential.
type Identity struct {
	Kinetic    estimate.Value // T_kin/T from the velocity
	FromPower  estimate.Value // 1 + Q·P/(omega0·kT)
	Difference estimate.Value // of the two, run part by run part
	Sigmas     float64        // Difference in standard errors; 0 where unknown
}

// holdsWithin is how many standard errors the identity may be off: a true
// identity is further off in one run of two thousand.
const holdsWithin = 3.5

// Holds reports whether the identity holds within its error.
func (i Identity) Holds() bool {
	return i.Difference.Known() && math.Abs(i.Sigmas) <= holdsWithin
}

// A Result is the effect of a loop on a run.
type Result struct {
	Ticks     int64
	Seconds   float64
	Truth     bool      // whether Realised and the energies rest on true positions
	Realised  Landscape // from true positions and velocities
	Measured  Landscape // from the sensor's positions
	Crossings Crossings
	Identity  Identity
}

// Result computes the effect from what was taken so far.
func (o *Observer) Result() Result {
	rows := o.ended()
	total := estimate.Totals(rows)
	if total == nil {
		total = make([]float64, sumsOfTheRun+2*(momentSums+o.scale.bins))
	}
	result := Result{Ticks: int64(total[sumTicks]), Seconds: total[sumTicks] / o.ref.Rate, Truth: o.truth}
	if o.truth {
		result.Realised = o.landscape(rows, total, false)
	} else {
		result.Realised = unknownLandscape("the true position is not known on this bench")
	}
	result.Measured = o.landscape(rows, total, true)
	result.Crossings, result.Identity = o.crossings(rows, total)
	return result
}

// landscape estimates one landscape and gives reasons for what is missing.
func (o *Observer) landscape(rows [][]float64, total []float64, measured bool) Landscape {
	r := newReader(o, total, measured)
	v := estimate.Jackknife(rows, r.quantities(), r.read)
	whole := make([]float64, r.quantities())
	r.read(whole, total)
	why := func(k int, reason string) {
		if !v[k].Known() && math.IsNaN(whole[k]) {
			v[k] = estimate.Unknown("%s", reason)
		}
	}
	if whole[density] == 0 {
		v[density] = estimate.Unknown("no tick of the run fell within %g sigma of the threshold", Window)
	}
	if whole[share] == 0 || whole[share] == 1 {
		v[share] = estimate.Unknown("only one side of the threshold was visited in the run")
	}
	oneSided := "only one side of the threshold was visited long enough"
	unvisited := "the threshold was not crossed often enough to show the density there; see the barrier from the parabolas"
	if math.IsNaN(whole[stiffness]) && total[sumTicks] > 0 {
		oneSided = "the position's distribution has no bottom of a well that a parabola fits"
		unvisited = oneSided
	}
	why(barrier, unvisited)
	for side := range trace.Level(trace.Levels) {
		unseen := fmt.Sprintf("the %s well was not visited long enough, or has no bottom of its own", side)
		for _, k := range []int{centres, stiffnesses} {
			why(k+int(side), unseen)
		}
		why(barriers+int(side), "the threshold or the "+side.String()+" well was not visited long enough")
	}
	why(barrierParabolas, "no well has a bottom that a parabola fits")
	why(distance, oneSided)
	why(stiffness, "no well has a bottom that a parabola fits")
	why(tilt, oneSided)
	why(kinetic, o.lagged.reason)
	why(width, "the wells are too shallow for a width on one side of the threshold")

	l := arrange(v)
	for k, first := range r.curve {
		middle := float64(first-o.scale.half) + curveBins/2.0
		l.Curve = append(l.Curve, CurvePoint{
			Position: o.scale.threshold + middle*o.ref.sigma()/binsPerSigma,
			Energy:   v[curve+k],
		})
	}
	return l
}

// arrange puts a reader's quantities in their places.
func arrange(v []estimate.Value) Landscape {
	l := Landscape{
		Barrier: v[barrier], BarrierFromParabolas: v[barrierParabolas], Distance: v[distance], Stiffness: v[stiffness],
		Tilt: v[tilt], KineticTemperature: v[kinetic], WidthTemperature: v[width], MeanAbsPosition: v[meanAbs],
		DensityAtThreshold: v[density], UpperShare: v[share],
	}
	copy(l.Barriers[:], v[barriers:])
	copy(l.Centres[:], v[centres:])
	copy(l.Stiffnesses[:], v[stiffnesses:])
	return l
}

// ended returns the rows with all that was taken in them.
func (o *Observer) ended() [][]float64 {
	o.flush(o.batches.Row())
	return o.batches.Rows()
}

func unknownLandscape(reason string) Landscape {
	u := estimate.Unknown("%s", reason)
	both := [trace.Levels]estimate.Value{u, u}
	return Landscape{
		Barrier: u, Barriers: both, BarrierFromParabolas: u, Distance: u, Centres: both, Stiffness: u, Stiffnesses: both,
		Tilt: u, KineticTemperature: u, WidthTemperature: u, MeanAbsPosition: u, DensityAtThreshold: u, UpperShare: u,
	}
}

package effect

import (
	"math"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trace"
)

// A Landscape is the potential of mean force that a trace shows, -kT·ln p(x)
// with the bath's kT, and what goes with it. Per-level values are indexed by
// trace.Level.
type Landscape struct {
	// Barrier is the barrier of the untilted wells, from the density: with
	// b_s = ln(p at the bottom of side s / p at the threshold),
	// ((√b_lower + √b_upper)/2)², which for two parabolas of one stiffness is
	// k·x1²/2 whatever the tilt. kT.
	Barrier estimate.Value
	// Barriers are b_s themselves. kT.
	Barriers [trace.Levels]estimate.Value
	// BarrierFromParabolas is the same, k·x1²/2, from the fitted parabolas'
	// curvature and distance to the midpoint; it needs no visit to the
	// threshold. kT.
	BarrierFromParabolas estimate.Value
	Distance             estimate.Value // between the fitted parabolas' bottoms, m
	Centres              [trace.Levels]estimate.Value
	Stiffness            estimate.Value // mean of the two, N/m
	Stiffnesses          [trace.Levels]estimate.Value
	Tilt                 estimate.Value // height of the upper well's bottom over the lower's, kT
	// KineticTemperature is m·<v²>/kT; from measured positions through the
	// correlation over a short lag, with white sensor noise removed.
	KineticTemperature estimate.Value
	// WidthTemperature is k·w²/kT, w the width of the normal distribution whose
	// part on one side of the threshold has the mean and the variance found
	// there; from measured positions with the known noise variance removed.
	WidthTemperature   estimate.Value
	MeanAbsPosition    estimate.Value // <|x - threshold|>, m
	DensityAtThreshold estimate.Value // share of ticks within 0.1 sigma of it, per that width, 1/m
	UpperShare         estimate.Value // share of ticks above the threshold
	Curve              []CurvePoint   // for drawing
}

// A CurvePoint is one point of the landscape.
type CurvePoint struct {
	Position float64        // m, from the midpoint
	Energy   estimate.Value // kT above the lowest point of Curve's parabola fits
}

// Order of the quantities that a reader computes; per-level ones take as many
// places as there are levels.
const (
	barrier          = 0
	barriers         = barrier + 1
	barrierParabolas = barriers + trace.Levels
	distance         = barrierParabolas + 1
	centres          = distance + 1
	stiffness        = centres + trace.Levels
	stiffnesses      = stiffness + 1
	tilt             = stiffnesses + trace.Levels
	kinetic          = tilt + 1
	width            = kinetic + 1
	meanAbs          = width + 1
	density          = meanAbs + 1
	share            = density + 1
	curve            = share + 1
)

// Where to look, in bins of sigma/50.
const (
	coarse          = 5  // bins that a bin of a well's fit joins
	fitReach        = 75 // a well is fitted within 1.5 sigma of its mean position …
	fitEdge         = 20 // … but not closer than 0.4 sigma to the threshold
	fitLeast        = 25 // a narrower window is not worth a fit
	thresholdReach  = 10 // the density at the threshold is extrapolated from 0.2 sigma
	thresholdWindow = 5  // half the window of the plain density there, 0.1 sigma
	curveBins       = 5  // a step of the curve, 0.1 sigma
	curveReach      = 4  // of the curve beyond the wells, sigma
)

// Window is half the width of the window about the threshold in which the
// plain density there is counted, in units of sigma = √(kT/k).
const Window = float64(thresholdWindow) / binsPerSigma

// A window is the part of a histogram that one fit takes, coarse bins of it.
type window struct {
	first, bins int       // first fine bin, number of coarse ones
	u           []float64 // centres of the coarse bins from the threshold, sigma
	counts      []float64
	start       *estimate.LogParabola // the whole run's fit, where a part's begins
	size        int                   // fine bins a coarse one
}

func newWindow(first, last, size, half int) *window {
	n := (last - first) / size
	w := &window{first: first, bins: n, size: size, u: make([]float64, n), counts: make([]float64, n)}
	for i := range w.u {
		middle := float64(first+i*size-half) + float64(size)/2
		w.u[i] = middle / binsPerSigma
	}
	return w
}

// fit returns the parabola through the window's part of hist.
func (w *window) fit(hist []float64) (estimate.LogParabola, bool) {
	for i := range w.counts {
		w.counts[i] = 0
		for _, n := range hist[w.first+i*w.size : w.first+(i+1)*w.size] {
			w.counts[i] += n
		}
	}
	c, ok := estimate.FitLogParabola(w.u, w.counts, w.start)
	if ok && w.start == nil {
		w.start = &c
	}
	return c, ok
}

// A reader computes a landscape's quantities from one row of sums. The windows
// are chosen once, from the whole run, and then are the same for its parts.
type reader struct {
	ref       Reference
	scale     scale
	offset    int // where moments and histogram begin in a row
	measured  bool
	lagged    *lagged
	bottom    [trace.Levels]*window // around each well; nil where it cannot be fitted
	threshold [trace.Levels]*window // beside the threshold; nil where the side was not visited
	curve     []int                 // first fine bin of each step of the curve
	deeper    int                   // well of the whole run; negative while that is not known
}

func (r *reader) quantities() int { return curve + len(r.curve) }

func newReader(o *Observer, total []float64, measured bool) *reader {
	r := &reader{ref: o.ref, scale: o.scale, offset: sumsOfTheRun, measured: measured, lagged: &o.lagged, deeper: -1}
	if measured {
		r.offset += momentSums + o.scale.bins
	}
	half := o.scale.half
	moments, hist := r.split(total)
	for side := range r.bottom {
		n, mean, _ := r.sideMoments(trace.Level(side), moments, hist)
		if n == 0 {
			continue
		}
		// Bins from the threshold, outwards; whole coarse ones.
		centre := int(math.Min(mean*r.scale.perMetre, float64(half)))
		near, far := max(fitEdge, centre-fitReach), min(centre+fitReach, half-1)
		near = far - (far-near)/coarse*coarse
		bottom, top := [2]int{near, far}, [2]int{0, thresholdReach}
		if side == int(trace.Lower) {
			bottom, top = [2]int{-far, -near}, [2]int{-thresholdReach, 0}
		}
		r.threshold[side] = newWindow(half+top[0], half+top[1], 1, half)
		if far-near >= fitLeast {
			r.bottom[side] = newWindow(half+bottom[0], half+bottom[1], coarse, half)
		}
	}
	reach := int(math.Ceil((r.ref.HalfDistance/r.ref.sigma() + curveReach) * binsPerSigma / curveBins))
	for k := -reach; k < reach; k++ {
		if first := half + k*curveBins; first >= 0 && first+curveBins <= o.scale.bins {
			r.curve = append(r.curve, first)
		}
	}
	whole := make([]float64, r.quantities())
	r.read(whole, total)
	switch up, low := whole[stiffnesses+int(trace.Upper)], whole[stiffnesses+int(trace.Lower)]; {
	case whole[tilt] < 0 || math.IsNaN(low) && !math.IsNaN(up):
		r.deeper = int(trace.Upper)
	case !math.IsNaN(low):
		r.deeper = int(trace.Lower)
	}
	return r
}

func (r *reader) split(row []float64) (moments, hist []float64) {
	row = row[r.offset:]
	return row[:momentSums], row[momentSums : momentSums+r.scale.bins]
}

// sideMoments returns the number of ticks on one side of the threshold, and
// mean and variance of the distance from it there, m and m².
func (r *reader) sideMoments(side trace.Level, moments, hist []float64) (n, mean, variance float64) {
	sum, square := moments[momentAbs]-moments[momentSum], moments[momentSquare]-moments[momentSigned]
	part := hist[:r.scale.half]
	if side == trace.Upper {
		sum, square = moments[momentAbs]+moments[momentSum], moments[momentSquare]+moments[momentSigned]
		part = hist[r.scale.half:]
	}
	for _, c := range part {
		n += c
	}
	if n == 0 {
		return 0, 0, 0
	}
	mean = sum / 2 / n
	return n, mean, square/2/n - mean*mean
}

// read is the estimate.Function of the landscape.
func (r *reader) read(dst, row []float64) {
	for k := range dst {
		dst[k] = math.NaN()
	}
	moments, hist := r.split(row)
	r.readMoments(dst, row, moments, hist)
	level := r.readWells(dst, hist)
	if math.IsNaN(level) {
		return
	}
	for k, first := range r.curve {
		n := 0.0
		for _, c := range hist[first : first+curveBins] {
			n += c
		}
		if n > 0 {
			dst[curve+k] = level - math.Log(n/curveBins)
		}
	}
}

// readMoments computes what needs no fit.
func (r *reader) readMoments(dst, row, moments, hist []float64) {
	var ticks float64 // with a position
	for _, n := range hist {
		ticks += n
	}
	if ticks == 0 {
		return
	}
	sigma, half := r.ref.sigma(), r.scale.half
	dst[meanAbs] = moments[momentAbs] / ticks
	near := 0.0
	for _, c := range hist[half-thresholdWindow : half+thresholdWindow] {
		near += c
	}
	dst[density] = near / ticks / (2 * thresholdWindow * sigma / binsPerSigma)

	var weight, temperature float64
	for side := range trace.Level(trace.Levels) {
		n, mean, variance := r.sideMoments(side, moments, hist)
		if side == trace.Upper {
			dst[share] = n / ticks
		}
		if n == 0 {
			continue
		}
		w2 := untruncated(mean, variance)
		if r.measured {
			w2 -= r.ref.SensorNoise * r.ref.SensorNoise
		}
		weight += n
		temperature += n * w2 / (sigma * sigma)
	}
	dst[width] = temperature / weight

	switch {
	case !r.measured:
		o := r.ref.Oscillator
		dst[kinetic] = row[sumVelocity2] / row[sumTicks] * o.Mass() / o.KT
	case row[sumPairs] > 0 && r.lagged.reason == "":
		dst[kinetic] = r.lagged.temperature(r.ref, row[sumDiff1]/row[sumPairs], row[sumDiff2]/row[sumPairs])
	}
}

// readWells fits the wells and the density beside the threshold, and returns
// ln(counts a bin) at the bottom of the deeper well: by the whole run, since
// its parts would differ about which one that is.
func (r *reader) readWells(dst, hist []float64) (lowest float64) {
	sigma := r.ref.sigma()
	lowest = math.NaN()
	var bottoms, tops, byParabola [trace.Levels]float64
	for side := range r.bottom {
		bottoms[side], tops[side], byParabola[side] = math.NaN(), math.NaN(), math.NaN()
		if r.threshold[side] == nil {
			continue
		}
		if top, ok := r.threshold[side].fit(hist); ok {
			tops[side] = top.At(0)
		}
		if r.bottom[side] == nil {
			continue
		}
		well, ok := r.bottom[side].fit(hist)
		if !ok {
			continue
		}
		u, height, ok := well.Vertex()
		if !ok {
			continue
		}
		height -= math.Log(coarse)
		bottoms[side] = height
		// Half the wells' distance by this well alone: its own to the midpoint.
		x1 := math.Abs(u + r.scale.threshold/sigma)
		byParabola[side] = -well[2] * x1 * x1
		dst[centres+side] = r.scale.threshold + u*sigma
		dst[stiffnesses+side] = -2 * well[2] * r.ref.Oscillator.Stiffness
		if side == r.deeper || r.deeper < 0 && !(height <= lowest) {
			lowest = height
		}
	}
	// The density is continuous at the threshold: both sides tell of one value.
	top := bothOrOne(tops[0], tops[1])
	for side := range bottoms {
		dst[barriers+side] = bottoms[side] - top
	}
	dst[barrier] = untilted(dst[barriers], dst[barriers+1])
	dst[barrierParabolas] = bothOrOne(byParabola[0], byParabola[1])
	dst[distance] = dst[centres+1] - dst[centres]
	dst[stiffness] = bothOrOne(dst[stiffnesses], dst[stiffnesses+1])
	dst[tilt] = bottoms[trace.Lower] - bottoms[trace.Upper]
	return lowest
}

// bothOrOne returns the mean of two numbers, or the one that is known.
func bothOrOne(a, b float64) float64 {
	switch {
	case math.IsNaN(a):
		return b
	case math.IsNaN(b):
		return a
	}
	return (a + b) / 2
}

// untilted returns k·x1²/2 from the barriers k·(x1±x0)²/2 of the two sides.
func untilted(a, b float64) float64 {
	root := (math.Sqrt(a) + math.Sqrt(b)) / 2 // NaN for a negative one
	return root * root
}

// untruncated returns the variance of the normal distribution whose part
// above zero has this mean and variance: with α = m/w and h = φ(α)/Φ(α) the
// part has mean w·(α + h) and variance w²·(1 - α·h - h²) (N.L. Johnson and S.
// Kotz, Continuous Univariate Distributions 1, 1970, ch. 13; from memory), so
// that mean²/variance, which grows with α, tells α. It is NaN where the shape
// is flatter than that of any α > -3.
func untruncated(mean, variance float64) float64 {
	part := func(alpha float64) (m, v float64) {
		h := math.Sqrt(2/math.Pi) * math.Exp(-alpha*alpha/2) / math.Erfc(-alpha/math.Sqrt2)
		return alpha + h, 1 - alpha*h - h*h
	}
	low, high := -3.0, 10.0
	if !(variance > 0) || mean*mean > high*high*variance {
		return variance // nothing is cut off
	}
	for high-low > 1e-12 {
		alpha := (low + high) / 2
		if m, v := part(alpha); m*m*variance < mean*mean*v {
			low = alpha
		} else {
			high = alpha
		}
	}
	if low == -3 {
		return math.NaN()
	}
	_, v := part(low)
	return variance / v
}

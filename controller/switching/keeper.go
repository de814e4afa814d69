package switching

import (
	"fmt"
	"math"

	"brinkwell/controller/trace"
)

// A KeeperConfig says how a threshold follows the sensor's zero.
type KeeperConfig struct {
	// ExpectedMidpoint is where the midpoint between the two levels' mean
	// measured positions lies while the sensor's zero is where it should be,
	// m: IdealMidpoint, so that tilted wells on a perfect bench stay as they
	// are. A loop that takes energy at its crossings is crossed less often and
	// has less of it: by the balance of momentum (derived) it is
	//
	//	J·v/ω0² · (1/p - 1/(1-p))
	//
	// for J crossings a second in either direction (chatter counted once) at a
	// mean speed v and a share p of the time in the upper well. On a bench
	// of 4 kT, Q 35 and 1.1 kT of tilt it was 0.0017 σ for an ideal 0.0043 σ,
	// and the difference, taken for drift, cost 0.014 kT of the tilt.
	ExpectedMidpoint float64
	TimeConstant     float64 // ticks; at least LeastTimeConstant
	Bound            float64 // largest travel of the threshold from the wanted one, m
	// Unvisited is for how many ticks a level may have no sample before the
	// threshold is frozen. At most four time constants: later a side's weight
	// is below 2 %, and a few ticks of its next visit would make its mean.
	Unvisited float64
}

// Ticks of a Keeper.
const (
	// keptTicks share one update, which then costs next to nothing a tick.
	keptTicks = 64
	// LeastTimeConstant of a Keeper, in ticks: sixteen updates.
	LeastTimeConstant = 16 * keptTicks
	// mostUnvisited is KeeperConfig.Unvisited's limit in time constants.
	mostUnvisited = 4
	mostTicks     = 1e18 // of a time constant: four of them are still an int64
)

// A Keeper lets a threshold follow the drift of a sensor's zero, which would
// tilt the wells. The travel of the threshold is that of the midpoint between
// the mean measured positions while either level is commanded, each mean taken
// over all ticks with weights that fade as exp(-age/TimeConstant), age in wall
// time. What follows a switch is in the means too, but nearly antisymmetrical,
// so that it cancels in the midpoint; and the midpoint depends far less on how
// long either well was visited than the balance of dwell times does.
//
// Because both means fade in wall time and not with their own visits, the
// travel lags by one and the same time however unequal the visits are: a zero
// that drifts at a steady rate is followed with a lag of
//
//	rate · TimeConstant / (1 - g),
//
// g = dM/d(threshold) by IdealMidpoint's M (derived). It stems from the wells
// themselves, cut off at the threshold, whose midpoint goes along with it.
// g is the mean of α·h(α) + h(α)² over the two sides, with h and α as in
// IdealMidpoint, and 1 - αh - h² is the variance of a truncated normal over
// that of the whole one, so 0 < g < 1 for any wells: below 2/π without a
// tilt, 0.02 at 4 kT. The loop through threshold and means has the gain
// g/(1 + iω·TimeConstant), below 1 at all frequencies; it is therefore stable
// with whatever delay the wells answer (small-gain theorem). What a short time
// constant costs is scatter, not stability: without drift the travel scatters
// by about σ·√(1/(Q·ω0·T)·(1/p + 1/(1-p))/4) for a time constant of T seconds
// and a share p of the time in the upper well (derived from the integral
// 1/(Q·ω0) of the oscillator's correlation; passages over the barrier add some
// tenths).
//
// The travel begins at zero, as if that had been known for long. It is frozen
// while a level has been without a sample for long; nothing is forgotten then.
// A sample that is not a finite number is ignored.
//
// A Keeper must be made by NewKeeper. It allocates nothing.
type Keeper struct {
	expected, bound float64
	unvisited       int64

	block [trace.Levels]levelSum // of the present update
	left  int                    // ticks until the update

	fade  float64                // a weight's loss from one update to the next
	means [trace.Levels]levelSum // faded
	prior float64                // weight, in ticks, of the zero known at the start
	since [trace.Levels]int64    // ticks since each level's last sample

	travel, lowest, highest float64 // m
	ticks, frozen           int64
	bounded                 bool
}

// A levelSum is Σ weight and Σ weight·(x - ExpectedMidpoint) over ticks.
type levelSum struct{ weight, sum float64 }

// NewKeeper makes a Keeper.
func NewKeeper(c KeeperConfig) (*Keeper, error) {
	switch {
	case math.IsNaN(c.ExpectedMidpoint) || math.IsInf(c.ExpectedMidpoint, 0):
		return nil, fmt.Errorf("switching: expected midpoint %g m, want a finite position", c.ExpectedMidpoint)
	case !(c.TimeConstant >= LeastTimeConstant && c.TimeConstant <= mostTicks):
		return nil, fmt.Errorf("switching: a threshold kept with a time constant of %g ticks, want %d to %g", c.TimeConstant, LeastTimeConstant, mostTicks)
	case !(c.Bound > 0) || math.IsInf(c.Bound, 0):
		return nil, fmt.Errorf("switching: largest travel of the threshold %g m, want a positive length", c.Bound)
	case !(c.Unvisited >= keptTicks && c.Unvisited <= mostUnvisited*c.TimeConstant):
		return nil, fmt.Errorf("switching: a threshold frozen after %g ticks without a visit, want %d ticks to %d time constants, %g ticks",
			c.Unvisited, keptTicks, mostUnvisited, mostUnvisited*c.TimeConstant)
	}
	k := &Keeper{
		expected:  c.ExpectedMidpoint,
		bound:     c.Bound,
		unvisited: int64(c.Unvisited),
		left:      keptTicks,
		fade:      -math.Expm1(-keptTicks / c.TimeConstant),
	}
	k.prior = keptTicks / k.fade // what a sample at every tick would weigh
	return k, nil
}

// add books the measured position of a tick, m, and the level decided from it.
// It reports whether it is time to update.
func (k *Keeper) add(x float64, level trace.Level) (due bool) {
	if d := x - k.expected; d-d == 0 { // finite
		k.block[level].weight++
		k.block[level].sum += d
	}
	k.left--
	return k.left == 0
}

// update moves the travel to what the means tell, and begins the next block.
func (k *Keeper) update() {
	block := k.block
	k.block, k.left = [trace.Levels]levelSum{}, keptTicks
	k.ticks += keptTicks
	frozen := false
	for s, b := range block {
		k.since[s] += keptTicks
		if b.weight > 0 {
			k.since[s] = 0
		}
		frozen = frozen || k.since[s] >= k.unvisited
	}
	if frozen {
		k.frozen += keptTicks
		return
	}
	k.prior -= k.prior * k.fade
	for s, b := range block {
		m := &k.means[s]
		m.weight += b.weight - m.weight*k.fade
		m.sum += b.sum - m.sum*k.fade
	}
	// The least-squares offset of two levels of unknown distance, with a prior
	// of zero: the midpoint, weighed by twice the harmonic mean of the weights.
	low, up := k.means[trace.Lower], k.means[trace.Upper]
	if weight := 4*low.weight*up.weight + k.prior*(low.weight+up.weight); weight > 0 {
		k.move(2 * (low.sum*up.weight + up.sum*low.weight) / weight)
	}
}

// move sets the travel, within its bound.
func (k *Keeper) move(travel float64) {
	k.travel = max(-k.bound, min(k.bound, travel))
	k.bounded = k.bounded || math.Abs(travel) > k.bound
	k.lowest, k.highest = min(k.lowest, k.travel), max(k.highest, k.travel)
}

// A KeeperState tells what a Keeper did so far.
type KeeperState struct {
	Travel  float64 // of the threshold from the wanted one, m
	Lowest  float64 // travel, m; not above zero
	Highest float64 // travel, m; not below zero
	Frozen  float64 // share of the time in which the threshold was frozen
	Bounded bool    // whether the midpoint was ever farther off than the bound
}

// State returns what the Keeper did so far.
func (k *Keeper) State() KeeperState {
	s := KeeperState{Travel: k.travel, Lowest: k.lowest, Highest: k.highest, Bounded: k.bounded}
	if k.ticks > 0 {
		s.Frozen = float64(k.frozen) / float64(k.ticks)
	}
	return s
}

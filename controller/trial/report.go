package trial

import (
	"fmt"
	"math"
	"time"

	"gonum.org/v1/gonum/integrate/quad"

	"brinkwell/controller/effect"
	"brinkwell/controller/estimate"
	"brinkwell/controller/theory"
	"brinkwell/controller/trace"
)

// A Report is what a bench says, printed and as JSON. Keys end in their unit.
type Report struct {
	Asked       Asked     `json:"asked"`
	Realised    Landscape `json:"realised"`
	Measured    Measured  `json:"measured"`
	Predicted   Predicted `json:"predicted"`
	Crossings   Crossings `json:"crossings"`
	Loop        Loop      `json:"loop"`
	Checks      Checks    `json:"checks"`
	Verdict     Verdict   `json:"verdict"`
	Pictures    *Pictures `json:"pictures,omitempty"` // where they were asked for
	Settings    any       `json:"settings,omitempty"` // set by whoever read them
	Seed        uint64    `json:"seed"`
	Ticks       int64     `json:"ticks"`
	Interrupted bool      `json:"interrupted"`
	Notes       []string  `json:"notes"` // what a reader should know before the figures
}

// Asked is the double well that was asked, and what a perfect loop would
// show of it.
type Asked struct {
	Barrier            float64 `json:"barrier_kT"`
	BarrierLower       float64 `json:"barrier_lower_kT"` // as seen from the lower well
	BarrierUpper       float64 `json:"barrier_upper_kT"`
	Distance           float64 `json:"distance_m"`
	Stiffness          float64 `json:"stiffness_N_per_m"`
	Tilt               float64 `json:"tilt_kT"`
	Temperature        float64 `json:"temperature_K"`
	Threshold          float64 `json:"threshold_m"`
	Sigma              float64 `json:"sigma_m"` // thermal width of one well
	MeanAbsPosition    float64 `json:"mean_abs_position_m"`
	DensityAtThreshold float64 `json:"density_at_threshold_per_m"`
	UpperShare         float64 `json:"upper_share"`
}

// A Landscape is effect.Landscape for a report.
type Landscape struct {
	Barrier              estimate.Value `json:"barrier_kT"`
	BarrierLower         estimate.Value `json:"barrier_lower_kT"`
	BarrierUpper         estimate.Value `json:"barrier_upper_kT"`
	BarrierFromParabolas estimate.Value `json:"barrier_from_parabolas_kT"`
	Distance             estimate.Value `json:"distance_m"`
	CentreLower          estimate.Value `json:"centre_lower_m"`
	CentreUpper          estimate.Value `json:"centre_upper_m"`
	Stiffness            estimate.Value `json:"stiffness_N_per_m"`
	StiffnessLower       estimate.Value `json:"stiffness_lower_N_per_m"`
	StiffnessUpper       estimate.Value `json:"stiffness_upper_N_per_m"`
	Tilt                 estimate.Value `json:"tilt_kT"`
	KineticTemperature   estimate.Value `json:"kinetic_temperature_ratio"`
	WidthTemperature     estimate.Value `json:"width_temperature_ratio"`
	MeanAbsPosition      estimate.Value `json:"mean_abs_position_m"`
	DensityAtThreshold   estimate.Value `json:"density_at_threshold_per_m"`
	UpperShare           estimate.Value `json:"upper_share"`
	Curve                []CurvePoint   `json:"curve"`
}

// A CurvePoint is one point of the potential -kT·ln p(x), kT above the
// bottom of the deeper well.
type CurvePoint struct {
	Position float64        `json:"position_m"`
	Asked    float64        `json:"asked_kT"`
	Energy   estimate.Value `json:"energy_kT"`
}

// Measured is the same as Realised and Crossings, from the sensor's positions.
type Measured struct {
	Landscape
	Overshoot estimate.Value `json:"overshoot_m"`
	Energy    estimate.Value `json:"energy_kT"`
	Power     estimate.Value `json:"power_kT_per_s"`
}

// Crossings is effect.Crossings for a report.
type Crossings struct {
	Count           int64          `json:"count"`
	Rate            estimate.Value `json:"rate_per_s"`
	SettledCount    int64          `json:"settled_count"`
	SettledRate     estimate.Value `json:"settled_rate_per_s"`
	MeanDwell       estimate.Value `json:"mean_dwell_s"`
	MeanDwellLower  estimate.Value `json:"mean_dwell_lower_s"`
	MeanDwellUpper  estimate.Value `json:"mean_dwell_upper_s"`
	RawDwellLower   estimate.Value `json:"raw_dwell_lower_s"`
	RawDwellUpper   estimate.Value `json:"raw_dwell_upper_s"`
	Overshoot       estimate.Value `json:"overshoot_m"`
	Energy          estimate.Value `json:"energy_kT"`
	Power           estimate.Value `json:"power_kT_per_s"`
	ChatterFraction estimate.Value `json:"chatter_fraction"`
}

// Loop is how the loop itself ran.
type Loop struct {
	Rate               float64  `json:"rate_Hz"`
	LatencyAsked       float64  `json:"latency_asked_s"`
	LatencyMean        *float64 `json:"latency_mean_s"` // these are null without an actuation
	LatencyMedian      *float64 `json:"latency_p50_s"`
	LatencyP99         *float64 `json:"latency_p99_s"`
	LatencyMax         *float64 `json:"latency_max_s"`
	ThresholdTravel    *Travel  `json:"threshold_travel"` // null where the threshold is not kept
	SensorNoise        float64  `json:"sensor_noise_m"`   // standard deviation of one sample
	MeasuredSeconds    float64  `json:"measured_s"`
	WallSeconds        float64  `json:"wall_s"`
	TicksPerWallSecond float64  `json:"ticks_per_wall_second"`
}

// Travel is how the threshold followed the sensor's zero.
type Travel struct {
	Present float64 `json:"present_m"` // from the threshold that was asked
	Lowest  float64 `json:"lowest_m"`
	Highest float64 `json:"highest_m"`
	Frozen  float64 `json:"frozen_share"`  // of the time, while a well was unvisited for long
	Bounded bool    `json:"bound_reached"` // it would have gone further
}

// Checks are the report's own consistency checks.
type Checks struct {
	StationaryIdentity StationaryIdentity `json:"stationary_identity"`
}

// StationaryIdentity is T_kin/T = 1 + Q·P/(omega0·kT).
type StationaryIdentity struct {
	Kinetic    estimate.Value `json:"kinetic_temperature_ratio"`
	FromPower  estimate.Value `json:"temperature_ratio_from_power"`
	Difference estimate.Value `json:"difference"`
	Sigmas     float64        `json:"difference_in_standard_errors"`
	Holds      bool           `json:"holds"`
}

// report makes the report of a run.
func (t *Trial) report(done int64, wall time.Duration) Report {
	c, e := t.config, t.observer.Result()
	r := Report{
		Asked:     c.asked(),
		Realised:  c.landscape(e.Realised),
		Measured:  Measured{c.landscape(e.Measured), e.Crossings.MeasuredOvershoot, e.Crossings.MeasuredEnergy, e.Crossings.MeasuredPower},
		Predicted: *t.predicted,
		Crossings: crossings(e.Crossings),
		Loop: Loop{
			Rate: c.Rate, LatencyAsked: c.Latency, SensorNoise: c.SensorNoise(),
			MeasuredSeconds: e.Seconds, WallSeconds: wall.Seconds(),
		},
		Checks: Checks{StationaryIdentity{
			Kinetic: e.Identity.Kinetic, FromPower: e.Identity.FromPower, Difference: e.Identity.Difference,
			Sigmas: e.Identity.Sigmas, Holds: e.Identity.Holds(),
		}},
		Seed: c.Seed, Ticks: done, Notes: append([]string{}, t.Warnings()...),
	}
	if l := e.Crossings.Latency; e.Crossings.Count > 0 {
		r.Loop.LatencyMean, r.Loop.LatencyMedian, r.Loop.LatencyP99, r.Loop.LatencyMax = &l.Mean, &l.Median, &l.P99, &l.Max
	}
	if c.KeepMidpoint {
		s := t.loop.Threshold()
		r.Loop.ThresholdTravel = &Travel{Present: s.Travel, Lowest: s.Lowest, Highest: s.Highest, Frozen: s.Frozen, Bounded: s.Bounded}
	}
	if wall > 0 {
		r.Loop.TicksPerWallSecond = float64(done) / wall.Seconds()
	}
	if x := r.Realised.MeanAbsPosition; x.Known() && x.Low > farOut*r.Asked.MeanAbsPosition {
		r.Notes = append(r.Notes, fmt.Sprintf(
			"the resonator swings far beyond the wells, <|x - threshold|> is %.2g times what was asked: the loop feeds it, as one with an inverted sensor or too long a delay does",
			x.Value/r.Asked.MeanAbsPosition))
	}
	r.Verdict = c.Tolerance.judge(r.Asked, r.Realised)
	return r
}

// farOut is how many times further out than asked a resonator is on average
// when its loop feeds it.
const farOut = 1.5

// asked is what was asked, with what a perfect loop would show.
func (c Config) asked() Asked {
	sigma := c.sigma()
	well := theory.Well{Barrier: c.barrier(), Offset: c.Threshold / sigma}
	lower, upper := well.Barriers()
	return Asked{
		Barrier: c.barrier(), BarrierLower: lower, BarrierUpper: upper,
		Distance: 2 * c.HalfDistance, Stiffness: c.Oscillator.Stiffness, Tilt: lower - upper,
		Temperature: c.Temperature, Threshold: c.Threshold, Sigma: sigma,
		MeanAbsPosition: well.MeanAbs(1) * sigma, DensityAtThreshold: windowDensity(well) / sigma,
		UpperShare: well.UpperOccupation(1),
	}
}

// windowDensity is the mean density of an ideal well within effect's window
// about the threshold, per sigma: beside a cusp the mean is above the value at
// the threshold, by 15 % at 4 kT.
func windowDensity(w theory.Well) float64 {
	mean := 0.0
	for _, side := range []float64{-1, 1} {
		slope := w.Centre() - side*w.Offset // of ln p at the threshold, 1/sigma
		mean += quad.Fixed(func(u float64) float64 { return math.Exp(slope*u - u*u/2) }, 0, effect.Window, 8, nil, 0)
	}
	return w.ThresholdDensity(1) * mean / (2 * effect.Window)
}

func (c Config) landscape(l effect.Landscape) Landscape {
	r := Landscape{
		Barrier: l.Barrier, BarrierLower: l.Barriers[trace.Lower], BarrierUpper: l.Barriers[trace.Upper],
		BarrierFromParabolas: l.BarrierFromParabolas,
		Distance:             l.Distance, CentreLower: l.Centres[trace.Lower], CentreUpper: l.Centres[trace.Upper],
		Stiffness: l.Stiffness, StiffnessLower: l.Stiffnesses[trace.Lower], StiffnessUpper: l.Stiffnesses[trace.Upper],
		Tilt: l.Tilt, KineticTemperature: l.KineticTemperature, WidthTemperature: l.WidthTemperature,
		MeanAbsPosition: l.MeanAbsPosition, DensityAtThreshold: l.DensityAtThreshold, UpperShare: l.UpperShare,
		Curve: make([]CurvePoint, len(l.Curve)),
	}
	for i, p := range l.Curve {
		r.Curve[i] = CurvePoint{Position: p.Position, Asked: c.potential(p.Position), Energy: p.Energy}
	}
	return r
}

// potential is the asked one at a position from the midpoint, in kT above the
// bottom of the deeper well.
func (c Config) potential(x float64) float64 {
	tilt := 2 * c.HalfDistance * c.Threshold / (c.sigma() * c.sigma())
	centre, bottom := -c.HalfDistance, math.Max(0, -tilt)
	if x > c.Threshold {
		centre, bottom = c.HalfDistance, math.Max(0, tilt)
	}
	u := (x - centre) / c.sigma()
	return u*u/2 + bottom
}

func crossings(c effect.Crossings) Crossings {
	return Crossings{
		Count: c.Count, Rate: c.Rate, SettledCount: c.SettledCount, SettledRate: c.SettledRate,
		MeanDwell: c.MeanDwell, MeanDwellLower: c.MeanDwells[trace.Lower], MeanDwellUpper: c.MeanDwells[trace.Upper],
		RawDwellLower: c.RawDwells[trace.Lower], RawDwellUpper: c.RawDwells[trace.Upper],
		Overshoot: c.Overshoot, Energy: c.Energy, Power: c.Power, ChatterFraction: c.ChatterFraction,
	}
}

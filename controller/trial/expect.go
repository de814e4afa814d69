package trial

import (
	"fmt"
	"math"
	"strings"

	"brinkwell/controller/theory"
)

// Predicted is what theory expects of the bench, with its range of validity.
type Predicted struct {
	Regime             string   `json:"regime"`
	InsideRange        bool     `json:"inside_range"`
	OutsideBecause     []string `json:"outside_because"`
	Delay              float64  `json:"effective_delay_s"` // latency, half a tick, lags
	KineticTemperature float64  `json:"kinetic_temperature_ratio"`
	Distance           float64  `json:"distance_m"`
	Stiffness          float64  `json:"stiffness_N_per_m"`
	Tilt               float64  `json:"tilt_kT"`
	MeanAbsPosition    float64  `json:"mean_abs_position_m"`
	Barrier            *float64 `json:"barrier_kT"` // as noise leaves it; null outside its range
	BarrierOutside     []string `json:"barrier_outside_because"`
	EscapeRateLow      *float64 `json:"escape_rate_low_per_s"`  // from well to well of the ideal potential …
	EscapeRateHigh     *float64 `json:"escape_rate_high_per_s"` // … between these; null where no theory brackets it
	UpperShare         float64  `json:"upper_share"`
	Count              float64  `json:"count"` // actuations in the run
	Rate               float64  `json:"rate_per_s"`
	SettledCount       float64  `json:"settled_count"`
	SettledRate        float64  `json:"settled_rate_per_s"`
	MeanDwellLower     float64  `json:"mean_dwell_lower_s"`
	MeanDwellUpper     float64  `json:"mean_dwell_upper_s"`
	ChatterFraction    float64  `json:"chatter_fraction"`
	Overshoot          float64  `json:"overshoot_m"`
	Energy             float64  `json:"energy_kT"`
	Power              float64  `json:"power_kT_per_s"`
	RatesInsideRange   bool     `json:"rates_inside_range"` // of what rests on SettledRate
	RatesOutside       []string `json:"rates_outside_because"`
}

// predict returns what theory expects. A bench that no theory covers is no
// error: it can still be simulated, and the prediction says why it has none.
func (c Config) predict() *Predicted {
	p, err := theory.Predict(c.Case())
	if err != nil {
		return &Predicted{Regime: "none", OutsideBecause: []string{err.Error()}, RatesOutside: []string{err.Error()}}
	}
	w0, sigma := c.Oscillator.Omega0, c.sigma()
	lacks := c.beyondTheory()
	temperature := p.Temperature
	if !(temperature > 0) { // far outside the range, which says so
		temperature = 1
	}
	e := &Predicted{
		Regime:             string(p.Regime),
		InsideRange:        p.Range.Inside() && len(lacks) == 0,
		OutsideBecause:     append(append([]string{}, lacks...), p.Range.Reasons...),
		Delay:              c.Delay(),
		Distance:           2 * c.HalfDistance,
		Stiffness:          c.Oscillator.Stiffness,
		Tilt:               2 * math.Sqrt(2*c.barrier()) * c.Case().Offset,
		MeanAbsPosition:    c.Case().Well().MeanAbs(temperature) * sigma,
		KineticTemperature: p.Temperature,
		UpperShare:         p.UpperOccupation,
		Count:              p.SwitchRate * w0 * c.Duration,
		Rate:               p.SwitchRate * w0,
		SettledCount:       p.SettledRate * w0 * c.Duration,
		SettledRate:        p.SettledRate * w0,
		Overshoot:          p.Overshoot * sigma,
		Energy:             p.EnergyPerSwitch,
		Power:              p.Power * w0,
		RatesInsideRange:   p.RatesRange.Inside() && len(lacks) == 0,
		RatesOutside:       append(append([]string{}, lacks...), p.RatesRange.Reasons...),
	}
	e.expectBarrier(c)
	e.expectEscape(c)
	if e.SettledRate > 0 && e.Rate > 0 {
		// Either well is left half as often as there are transitions.
		e.MeanDwellLower = (1 - e.UpperShare) * 2 / e.SettledRate
		e.MeanDwellUpper = e.UpperShare * 2 / e.SettledRate
		e.ChatterFraction = math.Max(0, 1-e.SettledRate/e.Rate)
	}
	return e
}

// expectBarrier expects the barrier that noise in the deciding sample leaves,
// where noise is what rounds the top of it.
func (e *Predicted) expectBarrier(c Config) {
	k := c.Case()
	barrier, r := theory.NoisyBarrier(k.Barrier, k.Noise)
	e.BarrierOutside = append(c.beyondTheory(), r.Reasons...)
	if k.HalfBand > 0.2*k.Noise {
		e.BarrierOutside = append(e.BarrierOutside, fmt.Sprintf("half band of %.3g sigma above a fifth of the noise, %.3g sigma", k.HalfBand, k.Noise))
	}
	if k.Delay > 0.2*k.Noise && k.Delay > 0.02 {
		e.BarrierOutside = append(e.BarrierOutside, fmt.Sprintf("delay of %.3g/omega0 above 0.02/omega0 and a fifth of the noise, %.3g sigma", k.Delay, k.Noise))
	}
	if k.Offset != 0 {
		e.BarrierOutside = append(e.BarrierOutside, "the wells are tilted")
	}
	if len(e.BarrierOutside) == 0 {
		e.Barrier = &barrier
	}
}

// expectEscape brackets the escape rate of the ideal wells.
func (e *Predicted) expectEscape(c Config) {
	k := c.Case()
	b := theory.EscapeRate(k.Quality, k.Barrier)
	if b.Range.Inside() && k.Offset == 0 {
		low, high := b.Low*c.Oscillator.Omega0, b.High*c.Oscillator.Omega0
		e.EscapeRateLow, e.EscapeRateHigh = &low, &high
	}
}

// fewCrossings is where a run shows too little of the density at the threshold
// to estimate from it.
const fewCrossings = 10

// Warnings says what a person should know before the bench runs.
func (t *Trial) Warnings() []string {
	var w []string
	c, p := t.config, t.predicted
	if p.Regime != "none" && p.Count < fewCrossings {
		w = append(w, fmt.Sprintf(
			"only %.2g crossings are expected in the run of %.4g s: the barrier of %.3g kT will rest on the fitted parabolas, and rates and dwell times may have no estimate; %.2g s would show about %d crossings",
			p.Count, c.Duration, c.barrier(), c.Duration*fewCrossings/p.Count, fewCrossings))
	}
	off := p.KineticTemperature - 1
	if p.Regime != "none" && math.Abs(off) > c.Tolerance.Temperature {
		trust := ""
		if !p.InsideRange {
			trust = " (a rough figure: " + strings.Join(p.OutsideBecause, "; ") + ")"
		}
		w = append(w, fmt.Sprintf(
			"the expected temperature is %.3f of the bath's%s, outside the tolerance of ±%g %%: the loop is too late or its band too wide for it (latency %.3g µs, half band %.3g nm)",
			p.KineticTemperature, trust, 100*c.Tolerance.Temperature, c.Latency*1e6, c.HalfBand*1e9))
	}
	return w
}

package theory

import "math"

// A Regime names the theory behind a prediction.
type Regime string

const (
	// PassChain follows the energy from pass to pass; Q ≥ 0.7.
	PassChain Regime = "pass chain"
	// FirstOrder takes the density at the threshold as Boltzmann's at the
	// temperature that it leads to.
	FirstOrder Regime = "first order"
	// ThermalVelocity takes the velocity as the bath's and the position as a
	// relay's; Q < 0.7.
	ThermalVelocity Regime = "thermal velocity"
)

// A Prediction is what a loop should do to its double well. All numbers are
// finite; Range tells whether they hold.
type Prediction struct {
	Regime Regime
	Range  Range

	Temperature     float64 // m⟨v²⟩ over the bath's k_B·T
	SwitchRate      float64 // raw actuations of a new level, both directions, ω₀
	EnergyPerSwitch float64 // U_new - U_old, kT; negative: taken from the resonator
	Power           float64 // of the loop into the resonator, kT·ω₀
	Overshoot       float64 // mean s·(x-x0) at the actuation, σ, s = ±1 the new side
	UpperOccupation float64 // share of the time on the upper level

	// SettledRate counts transitions, both directions, ω₀, after which the
	// resonator stays a whole period; EscapeRate is the mean rate from well
	// to well, ω₀, half the slowest decay rate of a difference in occupation.
	SettledRate, EscapeRate float64
	// RatesRange is the range of these two.
	RatesRange Range
}

// Predict picks the theory for c, and says what it expects, with which range.
// Inside the range the temperature was within 0.01 of exact simulations (0.003
// mostly), the raw switching rate within 10 %, the settled one within 10 % too. It returns the error of
// [Case.Validate], and takes some 5 ms, or up to 0.1 s with
// sensor noise and ticks below 0.001/ω₀.
func Predict(c Case) (Prediction, error) {
	if err := c.Validate(); err != nil {
		return Prediction{}, err
	}
	if c.Quality < chainQuality {
		return predictThermal(c), nil
	}
	if c.Delay == 0 && c.Tick == 0 {
		c.Delay = instant
	}
	if c.Delay < c.Tick/2*(1-1e-9) || !chainCan(c) {
		return predictFirstOrder(c), nil
	}
	r := solveChain(c)
	if r.stuck {
		p := predictFirstOrder(c)
		p.Range.require(false, "the loop may oscillate by itself")
		return p, nil
	}
	a := c.Well().Centre()
	p := Prediction{
		Regime: PassChain, Temperature: 1 + c.Quality*r.power, SwitchRate: r.switches,
		Power: r.power, UpperOccupation: min(max(r.upper, 0), 1), SettledRate: r.settled, EscapeRate: r.escape,
	}
	if r.switches > 0 {
		p.EnergyPerSwitch = r.power / r.switches
		p.Overshoot = -p.EnergyPerSwitch / (2 * a)
	}
	if r.escape < balanceRate {
		p.UpperOccupation = c.Well().UpperOccupation(1)
		p.Range.require(math.Abs(p.Temperature-1) < 0.01, "transitions so rare (%.3g ω₀) that the balance of the wells is lost in rounding", r.escape)
	}
	requireLoop(&p.Range, c)
	_, upper := Well{Barrier: c.Barrier, Offset: math.Abs(c.Offset)}.Barriers()
	p.Range.require(upper >= 1, "barrier of the shallower well %.3g kT below 1 kT", upper)
	p.Range.require(c.HalfBand <= a/4, "half band %.3g σ above a quarter of the wells' distance from the midpoint (%.3g σ)", c.HalfBand, a/4)
	p.Range.require(c.Delay <= 0.4, "delay %.3g/ω₀ above 0.4/ω₀", c.Delay)
	p.Range.require(c.Noise <= 0.25, "sensor noise %.3g σ above 0.25 σ", c.Noise)
	p.Range.require(c.Quality >= 2 || c.HalfBand <= 0.4, "half band %.3g σ above 0.4 σ at a quality below 2", c.HalfBand)
	p.Range.require(r.top < 1e-5, "energies up to %.3g kT are populated", c.Barrier+gridTop)
	p.RatesRange.Reasons = append(p.RatesRange.Reasons, p.Range.Reasons...)
	p.RatesRange.require(c.Quality >= 4, "quality %.3g below 4", c.Quality)
	p.RatesRange.require(c.Delay <= 0.12, "delay %.3g/ω₀ above 0.12/ω₀, beyond which settled transitions are undercounted", c.Delay)
	p.RatesRange.require(c.Noise <= 0.1, "sensor noise %.3g σ above 0.1 σ", c.Noise)
	return p, nil
}

const (
	chainQuality = 0.7
	chainBarrier = 30 // kT; above, the stationary state at the barrier is lost in rounding
	maxDelay     = math.Pi / 4
	maxTick      = 2 * math.Pi / 6
	noisyTick    = 2e-4  // 1/ω₀; finer ticks with noise take too long
	balanceRate  = 1e-10 // ω₀; below, rounding decides the chain's balance between the wells
	instant      = 1e-8  // 1/ω₀; stands for no delay where the chain needs one
)

// chainCan reports whether the chain's description makes sense: the noise
// must not reach the bottom of the wells, nor the numbers leave double precision.
func chainCan(c Case) bool {
	d := c.Well().Centre() - math.Abs(c.Offset)
	reach := d + 2*math.Abs(c.Offset) + c.HalfBand
	return noiseReach*c.Noise <= 0.8*(d+c.HalfBand) && reach*reach/2 <= chainBarrier &&
		c.Delay <= maxDelay && c.Tick <= maxTick && (c.Noise == 0 || c.Tick >= noisyTick)
}

// requireLoop adds what every regime needs of a loop.
func requireLoop(r *Range, c Case) {
	r.require(c.Delay <= maxDelay*(1+1e-9), "delay %.3g/ω₀ above an eighth of a period (%.3g/ω₀): the loop may oscillate by itself", c.Delay, maxDelay)
	r.require(c.Tick <= maxTick*(1+1e-9), "tick %.3g/ω₀ above a sixth of a period", c.Tick)
}

// FirstOrderTemperature solves
//
//	T = 1 - 2Q·a·[τ·T·p0(T) + h·ν(T, h)]
//
// for the temperature ratio T: τ the delay, h the half band, p0 the Boltzmann
// density at the threshold, ν [Well.BandRate], both at T. It holds for Q ≫ 1
// while the loss per crossing is small against 2πb/Q, the energy exchanged
// with the bath in one pass (beyond, it overstates the cooling); without
// sensor noise. A negative delay heats; the value stops at 50 then. It
// panics if c is not valid.
func FirstOrderTemperature(c Case) (float64, Range) {
	if err := c.Validate(); err != nil {
		panic(err.Error())
	}
	w, a := c.Well(), c.Well().Centre()
	excess := func(t float64) float64 {
		return t - 1 + 2*c.Quality*a*(c.Delay*t*w.ThresholdDensity(t)+c.HalfBand*w.BandRate(t, c.HalfBand))
	}
	const hottest = 50
	lo, hi := 1e-3, 1.0
	if excess(1) < 0 {
		lo, hi = 1, hottest
	}
	for range 60 {
		if m := (lo + hi) / 2; excess(m) < 0 {
			lo = m
		} else {
			hi = m
		}
	}
	t := (lo + hi) / 2
	var r Range
	requireLoop(&r, c)
	loss := 2 * a * (math.Abs(c.Delay)*math.Sqrt(math.Pi/2) + c.HalfBand)
	_, upper := Well{Barrier: c.Barrier, Offset: math.Abs(c.Offset)}.Barriers()
	exchange := 2 * math.Pi * upper / c.Quality
	r.require(loss <= 0.1*exchange || math.Abs(t-1) < 0.01, "loss of %.3g kT a crossing not small against the %.3g kT exchanged with the bath in a pass", loss, exchange)
	r.require(t < hottest/2 && t > 0.5, "temperature ratio %.3g far from 1", t)
	r.require(c.Noise <= 0.1*c.HalfBand || c.Noise <= 0.1*math.Abs(c.Delay), "sensor noise %.3g σ not small against the half band", c.Noise)
	r.require(c.Quality >= 5, "quality %.3g below 5", c.Quality)
	return t, r
}

func predictFirstOrder(c Case) Prediction {
	t, r := FirstOrderTemperature(c)
	w, a := c.Well(), c.Well().Centre()
	p := Prediction{
		Regime: FirstOrder, Range: r, Temperature: t, Power: (t - 1) / c.Quality,
		SwitchRate: w.BandRate(t, c.HalfBand), UpperOccupation: w.UpperOccupation(t),
	}
	if p.SwitchRate > 0 {
		p.EnergyPerSwitch = p.Power / p.SwitchRate
		p.Overshoot = -p.EnergyPerSwitch / (2 * a)
	}
	p.idealRates(c)
	return p
}

// idealRates takes the settled and the escape rate of the well without the
// loop's effect.
func (p *Prediction) idealRates(c Case) {
	ideal := Case{Quality: c.Quality, Barrier: c.Barrier, Offset: c.Offset, Delay: instant}
	if c.Quality >= chainQuality && chainCan(ideal) {
		r := solveChain(ideal)
		p.SettledRate, p.EscapeRate = r.settled, r.escape
	} else {
		e := EscapeRate(c.Quality, c.Barrier)
		p.EscapeRate = math.Sqrt(e.Low * e.High)
		p.SettledRate = p.EscapeRate
		p.RatesRange.Reasons = append(p.RatesRange.Reasons, e.Range.Reasons...)
		p.RatesRange.require(c.Offset == 0, "threshold %.3g σ off the midpoint, while the bounds of the escape rate are those of equal wells", c.Offset)
		p.RatesRange.require(c.Quality >= 0.3, "at quality %.3g below 0.3 a period is too short to settle", c.Quality)
	}
	p.RatesRange.require(math.Abs(p.Temperature-1) < 0.02 && c.HalfBand <= 0.02 && c.Noise <= 0.02, "the rates are those of a loop that is faultless; this one has a temperature ratio of %.3g, a half band of %.3g σ and noise of %.3g σ", p.Temperature, c.HalfBand, c.Noise)
}

// predictThermal predicts for a resonator too damped for the loop to cool:
// it switches as a relay with its band widened by inertia and sampling, and
// loses 2a times the overshoot at each actuation.
func predictThermal(c Case) Prediction {
	w, a, h := c.Well(), c.Well().Centre(), c.HalfBand
	dt := c.Tick
	if dt == 0 {
		dt = 1e-6 * c.Quality
	}
	near, shift := inertialShift(0, c.Quality, dt), inertialShift(h, c.Quality, dt)
	rate := func(h float64) float64 {
		return 2 * c.Quality / (RelayDwell(a-c.Offset, h) + RelayDwell(a+c.Offset, h))
	}
	p := Prediction{Regime: ThermalVelocity, UpperOccupation: w.UpperOccupation(1)}
	// Without a band the samples' changes of sign are known exactly; the
	// relay scales them down.
	spread := tickSpread(c.Quality, dt)
	p.SwitchRate = w.ThresholdDensity(1) * math.Sqrt(2/math.Pi) * spread / dt
	if r := rate(near); r > 0 {
		p.SwitchRate *= rate(h+shift) / r
	}
	// Overshoot beyond the band, from free flight: half the tick's
	// displacement, and what the velocity at detection adds until the actuation.
	latency := c.Delay - c.Tick/2 // negative: the loop looks ahead
	correlated := c.Quality * c.Quality * math.Expm1(-dt/c.Quality) * math.Copysign(math.Expm1(-math.Abs(latency)/c.Quality), -latency)
	p.Overshoot = h + (spread*spread/2+correlated)/(math.Sqrt(2/math.Pi)*spread)
	p.EnergyPerSwitch = -2 * a * p.Overshoot
	p.Power = p.SwitchRate * p.EnergyPerSwitch
	p.Temperature = 1 + c.Quality*p.Power
	requireLoop(&p.Range, c)
	p.Range.require(p.Temperature > 0.95 && p.Temperature < 1.05, "temperature ratio %.3g further than 0.05 from 1", p.Temperature)
	p.Temperature = math.Max(p.Temperature, 0)
	pull := a * math.Abs(c.Delay) / (1 + h/shift)
	p.Range.require(pull <= 0.12, "delay %.3g/ω₀ so long that the old parabola pulls the resonator back (%.3g of its speed, above 0.12)", c.Delay, pull)
	p.Range.require(c.Tick*c.Quality <= 0.1, "tick %.3g/ω₀ above a tenth of the relaxation time (%.3g/ω₀)", c.Tick, 1/c.Quality)
	product := a * h * shift
	p.Range.require(product <= 0.2, "half band %.3g σ too wide for the band's widening by inertia and sampling (%.3g σ): √(2b) times their product is %.3g, above 0.2", h, shift, product)
	p.Range.require(c.Noise <= 0.1*(h+shift), "sensor noise %.3g σ not small against the band in effect (%.3g σ)", c.Noise, h+shift)
	p.idealRates(c)
	return p
}

// A Count is a number of events expected in a run, between its bounds.
type Count struct {
	Low, High float64
	Range     Range
}

// Crossings returns how many actuations and how many transitions from well
// to well are expected in a run of the given length in periods 2π/ω₀ ≥ 0. Bounds
// are those of the theories: 10 % about the prediction inside its range, a
// factor of two, no statistical statement, outside. It returns the error
// of [Predict].
func Crossings(c Case, periods float64) (raw, settled Count, err error) {
	if !(periods >= 0) || math.IsInf(periods, 1) {
		panic("theory: run length negative or infinite")
	}
	p, err := Predict(c)
	if err != nil {
		return Count{}, Count{}, err
	}
	count := func(rate float64, r Range) Count {
		f := 1.1
		if !r.Inside() {
			f = 2
		}
		n := rate * 2 * math.Pi * periods
		return Count{Low: n / f, High: n * f, Range: r}
	}
	return count(p.SwitchRate, p.Range), count(p.SettledRate, p.RatesRange), nil
}

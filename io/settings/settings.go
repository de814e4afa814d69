// Package settings turns a settings file, the environment and command-line
// assignments into checked values with units, and writes them as a file again.
//
// It may not import anything of this project, print, or look at the
// environment by itself. Only the command reads its result, and hands plain
// values in SI on.
package settings

import "math"

// Settings describe one bench. They come from Load, which has checked them; a
// nil field was not stated, its twin was (wells.barrier or wells.distance,
// wells.tilt or loop.threshold), and the methods give both in either case.
// WriteTOML and the table of keys document the meaning of each.
type Settings struct {
	Resonator Resonator `mapstructure:"resonator"`
	Wells     Wells     `mapstructure:"wells"`
	Loop      Loop      `mapstructure:"loop"`
	Sensor    Sensor    `mapstructure:"sensor"`
	Output    Output    `mapstructure:"output"`
	Run       Run       `mapstructure:"run"`
	Tolerance Tolerance `mapstructure:"tolerance"`
}

// Resonator holds the values at zero volts, and the bath's temperature.
type Resonator struct {
	Frequency   Hertz          `mapstructure:"frequency"`
	Stiffness   NewtonPerMetre `mapstructure:"stiffness"`
	Quality     Bare           `mapstructure:"quality"`
	Temperature Kelvin         `mapstructure:"temperature"`
}

// Wells is the double well that is asked for.
type Wells struct {
	Barrier  *Bare  `mapstructure:"barrier"` // kT; nil where Distance is stated
	Distance *Metre `mapstructure:"distance"`
	Tilt     *Bare  `mapstructure:"tilt"` // kT; nil where Loop.Threshold is stated
}

// Loop is the loop and its imperfections.
type Loop struct {
	Rate      Hertz  `mapstructure:"rate"`
	Threshold *Metre `mapstructure:"threshold"` // from the midpoint; nil where Wells.Tilt is stated
	HalfBand  Metre  `mapstructure:"half_band"`
	Latency   Second `mapstructure:"latency"`

	Jitter        Second `mapstructure:"jitter"`
	JitterShape   Choice `mapstructure:"jitter_shape"`
	LostTicks     Bare   `mapstructure:"lost_ticks"` // probability
	HoldOff       Second `mapstructure:"hold_off"`
	KeepThreshold Choice `mapstructure:"keep_threshold"`
}

// Sensor is the position sensor.
type Sensor struct {
	Noise     MetrePerRootHertz `mapstructure:"noise"` // one-sided
	Bandwidth Hertz             `mapstructure:"bandwidth"`
	HighPass  Hertz             `mapstructure:"high_pass"`
	Bits      Count             `mapstructure:"bits"`
	Range     Metre             `mapstructure:"range"`
	Offset    Metre             `mapstructure:"offset"`
	Drift     MetrePerSecond    `mapstructure:"drift"`
	GainError Bare              `mapstructure:"gain_error"`
	Sense     Count             `mapstructure:"sense"`  // +1 or -1
	Sticks    Bare              `mapstructure:"sticks"` // probability

	HumAmplitude Metre `mapstructure:"hum_amplitude"`
	HumFrequency Hertz `mapstructure:"hum_frequency"`
}

// Output is the way from a level to the force.
type Output struct {
	Lag Second `mapstructure:"lag"`
}

// Run is what is simulated or recorded. Load resolves WarmUp where it was not stated.
type Run struct {
	Duration Second `mapstructure:"duration"` // without WarmUp
	WarmUp   Second `mapstructure:"warm_up"`
	Seed     Count  `mapstructure:"seed"` // not negative
}

// Tolerance is what the verdict allows, relative.
type Tolerance struct {
	Barrier     Bare `mapstructure:"barrier"`
	Temperature Bare `mapstructure:"temperature"`
}

// boltzmann is the Boltzmann constant, J/K, exact by the definition of the
// kelvin: SI Brochure, 9th edition (2019) (from memory).
const boltzmann = 1.380649e-23

// KT returns the thermal energy kB·T, in joules.
func (s Settings) KT() float64 { return boltzmann * float64(s.Resonator.Temperature) }

// Omega0 returns the angular resonance frequency, in 1/s.
func (s Settings) Omega0() float64 { return 2 * math.Pi * float64(s.Resonator.Frequency) }

// HalfDistance returns x1, half the distance from well to well, in metres.
func (s Settings) HalfDistance() float64 {
	if s.Wells.Distance != nil {
		return float64(*s.Wells.Distance) / 2
	}
	return math.Sqrt(2 * float64(*s.Wells.Barrier) * s.KT() / float64(s.Resonator.Stiffness))
}

// DistanceM returns the distance from well to well, 2·x1, in metres.
func (s Settings) DistanceM() float64 { return 2 * s.HalfDistance() }

// BarrierKT returns the barrier without tilt, k·x1²/2, in kT.
func (s Settings) BarrierKT() float64 {
	if s.Wells.Barrier != nil {
		return float64(*s.Wells.Barrier)
	}
	x1 := s.HalfDistance()
	return float64(s.Resonator.Stiffness) * x1 * x1 / 2 / s.KT()
}

// TiltKT returns the energy of the upper well less that of the lower,
// 2·k·x1·x0 for a threshold at x0, in kT.
func (s Settings) TiltKT() float64 {
	if s.Wells.Tilt != nil {
		return float64(*s.Wells.Tilt)
	}
	return 2 * float64(s.Resonator.Stiffness) * s.HalfDistance() * float64(*s.Loop.Threshold) / s.KT()
}

// ThresholdM returns the threshold x0 relative to the midpoint between the
// wells, in metres.
func (s Settings) ThresholdM() float64 {
	if s.Loop.Threshold != nil {
		return float64(*s.Loop.Threshold)
	}
	return float64(*s.Wells.Tilt) * s.KT() / (2 * float64(s.Resonator.Stiffness) * s.HalfDistance())
}

// Ticks returns the length of the run, in whole ticks.
func (s Settings) Ticks() int64 { return int64(math.Round(s.ticks(s.Run.Duration))) }

// WarmUpTicks returns the whole ticks that cover the warm-up.
func (s Settings) WarmUpTicks() int64 { return int64(math.Ceil(s.ticks(s.Run.WarmUp))) }

func (s Settings) ticks(t Second) float64 { return float64(t) * float64(s.Loop.Rate) }

// defaultWarmUp is the time in which a resonator forgets how it began: 20 times
// the longer of the decay time of its energy, Q/omega0, and, overdamped, its
// relaxation time, 1/(Q·omega0).
func (s Settings) defaultWarmUp() Second {
	q := float64(s.Resonator.Quality)
	return Second(20 * max(q, 1/q) / s.Omega0())
}

// characteristic returns the rate, in 1/s, at which the resonator moves, and
// the name of its inverse: the resonance frequency, or for an overdamped
// resonator the inverse of its relaxation time, Q·omega0.
func (s Settings) characteristic() (rate float64, name string) {
	if q := float64(s.Resonator.Quality); q < 0.5 {
		return q * s.Omega0(), "relaxation time"
	}
	return float64(s.Resonator.Frequency), "period"
}

package trial

import (
	"fmt"
	"math"

	"brinkwell/controller/theory"
	"brinkwell/plant/chain"
)

// delayLine is how late levels act.
func (c Config) delayLine() chain.DelayConfig {
	return chain.DelayConfig{Rate: c.Rate, Latency: c.Latency, Jitter: c.Jitter, Shape: c.Shape}
}

// Delay is the mean time from the crossing of the threshold to where its
// actuation acts, s: latency, half a tick, the ticks that a lost or stuck
// sample costs, and the lags of sensor and output.
func (c Config) Delay() float64 {
	delay := c.delayLine().Mean() + 0.5/c.Rate + c.Lag
	for _, p := range []float64{c.LostTicks, c.Sensor.Sticks} {
		delay += p / (1 - p) / c.Rate
	}
	if c.Sensor.Bandwidth > 0 {
		delay += 1 / (2 * math.Pi * c.Sensor.Bandwidth)
	}
	return delay
}

// Case is the bench in the reduced units of the predictions. A reading of
// (1 + gain error)·x + offset is compared with threshold and band as a true
// position is with (threshold - offset)/(1 + gain error) and a band smaller by
// the same factor; a drifting offset counts with its mean over the run.
func (c Config) Case() theory.Case {
	w0, gain := c.Oscillator.Omega0, 1+c.Sensor.GainError
	offset := c.Sensor.Offset + c.Sensor.Drift*c.Duration/2
	if c.Sensor.HighPass > 0 || c.KeepMidpoint {
		offset = 0 // it does not reach the threshold, or the threshold follows it
	}
	return theory.Case{
		Quality:  c.Oscillator.Quality,
		Barrier:  c.barrier(),
		Offset:   (c.Threshold - offset) / gain / c.sigma(),
		Delay:    c.Delay() * w0,
		HalfBand: c.HalfBand / gain / c.sigma(),
		Noise:    c.SensorNoise() / gain / c.sigma(),
		Tick:     w0 / c.Rate,
	}
}

// beyondTheory says what of the bench no prediction takes into account, so
// that none is given as if it held.
func (c Config) beyondTheory() []string {
	var reasons []string
	require := func(ok bool, format string, args ...any) {
		if !ok {
			reasons = append(reasons, fmt.Sprintf(format, args...))
		}
	}
	s, sigma := c.Sensor, c.sigma()
	require(!s.Inverted, "the reading goes against the position")
	require(s.HighPass == 0, "AC coupling (a high-pass of %.4g Hz) lets the threshold wander", s.HighPass)
	require(c.KeepMidpoint || math.Abs(s.Drift)*c.Duration <= 0.1*sigma, "the sensor drifts by %.3g of a well's width over the run, above 0.1", math.Abs(s.Drift)*c.Duration/sigma)
	require(s.HumAmplitude <= 0.05*sigma, "hum of %.3g of a well's width, above 0.05, moves the threshold", s.HumAmplitude/sigma)
	reach := math.Abs(c.Threshold-s.Offset) + c.HalfBand
	require(s.Converter.Range == 0 || s.Converter.Range > reach, "the converter clips within the band")
	step := s.Converter.Step()
	require(step <= 2*c.sensor().NoiseSD() || step <= 0.02*sigma, "converter steps of %.3g of a well's width are coarser than twice the noise that would smooth them", step/sigma)
	require(c.Jitter*c.Oscillator.Omega0 <= 0.1, "jitter of %.3g/omega0 above 0.1/omega0", c.Jitter*c.Oscillator.Omega0)
	require(c.LostTicks+s.Sticks <= 0.2, "%.3g of the ticks are lost or stuck, above 0.2", c.LostTicks+s.Sticks)
	require(c.HoldOff == 0 || c.HoldOff*c.Oscillator.Omega0 <= 0.05, "a hold-off of %.3g/omega0 suppresses recrossings", c.HoldOff*c.Oscillator.Omega0)
	return reasons
}

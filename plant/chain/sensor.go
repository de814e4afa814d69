package chain

import (
	"fmt"
	"math"
	"math/cmplx"

	"brinkwell/plant/variate"
)

// A SensorConfig is what is wrong with a sensor. Zero means none.
type SensorConfig struct {
	Rate         float64 // ticks, 1/s
	Density      float64 // white noise, one-sided, m/√Hz
	Bandwidth    float64 // one pole, Hz
	HighPass     float64 // one pole, Hz
	GainError    float64 // relative, of the position
	Inverted     bool    // whether the reading goes the other way
	Offset       float64 // m, ahead of the high-pass
	Drift        float64 // of the offset, m/s, from tick 0 on
	HumAmplitude float64 // m, ahead of the poles
	HumFrequency float64 // Hz
	Converter    Converter
	Sticks       float64 // probability that a sample repeats the one before
}

// Plain reports whether nothing is wrong but white noise.
func (c SensorConfig) Plain() bool {
	return c == SensorConfig{Rate: c.Rate, Density: c.Density}
}

// Validate names what is out of its domain.
func (c SensorConfig) Validate() error {
	for _, f := range []struct {
		name  string
		value float64
		ok    bool
		want  string
	}{
		{"rate", c.Rate, c.Rate > 0, "positive"},
		{"noise", c.Density, c.Density >= 0, "not negative"},
		{"bandwidth", c.Bandwidth, c.Bandwidth >= 0, "not negative"},
		{"high-pass", c.HighPass, c.HighPass >= 0, "not negative"},
		{"gain error", c.GainError, c.GainError > -1, "above -1"},
		{"offset", c.Offset, !math.IsNaN(c.Offset), "a number"},
		{"drift", c.Drift, !math.IsNaN(c.Drift), "a number"},
		{"hum amplitude", c.HumAmplitude, c.HumAmplitude >= 0, "not negative"},
		{"hum frequency", c.HumFrequency, c.HumFrequency >= 0, "not negative"},
		{"sticks", c.Sticks, c.Sticks >= 0 && c.Sticks < 1, "a probability below 1"},
	} {
		if !f.ok || math.IsInf(f.value, 0) {
			return fmt.Errorf("chain: sensor %s is %g, must be %s", f.name, f.value, f.want)
		}
	}
	return c.Converter.validate()
}

// White is a sensor with nothing but white noise of a standard deviation in
// each sample, m.
func White(sd, rate float64) SensorConfig {
	return SensorConfig{Rate: rate, Density: sd / math.Sqrt(rate/2)}
}

// NoiseSD is the standard deviation of one sample's noise, m. White noise of
// one-sided density S has the variance S·π/2·f behind a pole at f, and S·rate/2
// where nothing but the sampling limits it. The high-pass takes from the
// former the share high/(bandwidth + high).
func (c SensorConfig) NoiseSD() float64 {
	if c.Bandwidth == 0 {
		return c.Density * math.Sqrt(c.Rate/2)
	}
	variance := c.Density * c.Density * math.Pi / 2 * c.Bandwidth
	return math.Sqrt(variance * c.Bandwidth / (c.Bandwidth + c.HighPass))
}

// A Sensor turns the position behind the sensor's poles into a reading: noise
// and all that is deterministic about its errors are added, then it is
// converted. It must be made by NewSensor and must not be used by two
// goroutines at once.
type Sensor struct {
	config SensorConfig
	noise  *Noise
	draw   *variate.Normal // for what happens at random

	gain          float64
	offset, drift float64    // behind the poles, m and m/s
	hum           complex128 // amplitude behind the poles, at tick 0
	cycles        float64    // of the hum in a tick
	last          float64    // reading, m
	begins        bool       // whether there was no reading yet
}

// NewSensor makes a Sensor. draw is its source for sticking samples and for
// the hum's phase.
func NewSensor(c SensorConfig, noise, draw *variate.Normal) (*Sensor, error) {
	if err := c.Validate(); err != nil {
		return nil, err
	}
	s := &Sensor{
		config: c, noise: NewNoise(c, noise), draw: draw,
		gain: 1 + c.GainError, offset: c.Offset, drift: c.Drift,
		cycles: c.HumFrequency / c.Rate, begins: true,
	}
	if c.Inverted {
		s.gain = -s.gain
	}
	// Ramp and hum as they are once the poles' transients are over: the
	// low-pass lags behind a ramp by its time constant, the high-pass leaves of
	// it what it gains in its own.
	if c.Bandwidth > 0 {
		s.offset -= c.Drift / (2 * math.Pi * c.Bandwidth)
	}
	if c.HighPass > 0 {
		s.offset, s.drift = c.Drift/(2*math.Pi*c.HighPass), 0
	}
	if c.HumAmplitude > 0 {
		s.hum = cmplx.Rect(c.HumAmplitude, 2*math.Pi*draw.Float64()) * c.Response(c.HumFrequency)
	}
	return s, nil
}

// Response is the transfer function of the sensor's poles at a frequency, Hz.
func (c SensorConfig) Response(f float64) complex128 {
	h := complex(1, 0)
	if c.Bandwidth > 0 {
		h /= complex(1, f/c.Bandwidth)
	}
	if c.HighPass > 0 {
		h *= complex(0, f/c.HighPass) / complex(1, f/c.HighPass)
	}
	return h
}

// Read returns the reading at a tick for a position behind the poles, m. It
// does not allocate.
func (s *Sensor) Read(tick int64, seen float64) float64 {
	c := &s.config
	reading := s.gain*seen + s.noise.Next() + s.offset
	if s.drift != 0 {
		reading += s.drift * float64(tick) / c.Rate
	}
	if s.hum != 0 {
		_, turn := math.Modf(s.cycles * float64(tick))
		sin, cos := math.Sincos(2 * math.Pi * turn)
		reading += real(s.hum)*sin + imag(s.hum)*cos
	}
	reading = c.Converter.Convert(reading)
	if c.Sticks > 0 {
		if s.draw.Float64() < c.Sticks && !s.begins {
			reading = s.last
		}
		s.last, s.begins = reading, false
	}
	return reading
}

// A Converter is an analogue-to-digital converter. The zero value converts
// nothing.
type Converter struct {
	Bits  int     // resolution; 0: continuous
	Range float64 // it converts -Range to +Range, m; 0: unlimited
}

func (c Converter) validate() error {
	switch {
	case c.Bits < 0 || c.Bits > 48:
		return fmt.Errorf("chain: converter of %d bits, want 1 to 48, or 0 for none", c.Bits)
	case !(c.Range >= 0) || math.IsInf(c.Range, 0):
		return fmt.Errorf("chain: converter range %g m must be finite and not negative", c.Range)
	case c.Bits > 0 && c.Range == 0:
		return fmt.Errorf("chain: a converter of %d bits needs a range", c.Bits)
	}
	return nil
}

// Step is the size of one code, m: 2·Range/2^Bits; 0 for a continuous one.
func (c Converter) Step() float64 {
	if c.Bits == 0 {
		return 0
	}
	return math.Ldexp(2*c.Range, -c.Bits)
}

// Convert returns what the converter gives for x, m: two's complement codes,
// from -2^(Bits-1) to 2^(Bits-1) - 1, each for the half step below it and the
// half step above, and the code at the end for what lies beyond.
func (c Converter) Convert(x float64) float64 {
	switch {
	case c.Bits > 0:
		step := c.Step()
		code := math.Floor(x/step + 0.5)
		top := math.Ldexp(1, c.Bits-1)
		return step * math.Min(math.Max(code, -top), top-1)
	case c.Range > 0:
		return math.Min(math.Max(x, -c.Range), c.Range)
	}
	return x
}

package trial

import (
	"math"
	"math/cmplx"

	"brinkwell/controller/effect"
	"brinkwell/controller/theory"
	"brinkwell/controller/trace"
)

// Pictures is what a report's pictures show, as numbers.
type Pictures struct {
	Trace       TracePicture `json:"trace"`
	DwellsLower []Bin        `json:"settled_dwells_lower_s"` // by the well that was left
	DwellsUpper []Bin        `json:"settled_dwells_upper_s"`
	Overshoots  []Bin        `json:"overshoots_m"`
	Spectrum    Spectrum     `json:"spectrum"`
	Expected    []Point      `json:"expected_landscape"` // empty where no theory covers the bench
}

// TracePicture is a stretch of the run around an actuation.
type TracePicture struct {
	Time     []float64 `json:"time_s"` // from the start of the measured run
	Position []float64 `json:"position_m"`
	Measured []float64 `json:"measured_m"`
	Level    []int     `json:"level"` // decided at that tick: 0 the lower, 1 the upper
}

// A Bin is one bin of a histogram; its ends are in the unit of its key.
type Bin struct {
	From  float64 `json:"from"`
	To    float64 `json:"to"`
	Count int64   `json:"count"`
}

// A Point is one point of a potential.
type Point struct {
	Position float64 `json:"position_m"`
	Energy   float64 `json:"energy_kT"`
}

// Spectrum is the one-sided spectral density of the measured position, with
// that of a thermal resonator in one well that is sampled as the bench samples
// it, through the sensor and its noise; what the measured one has more at low
// frequencies are the jumps between the wells.
type Spectrum struct {
	Segments  int       `json:"segments_averaged"`
	Frequency []float64 `json:"frequency_Hz"`
	Measured  []float64 `json:"measured_m2_per_Hz"`
	Model     []float64 `json:"model_m2_per_Hz"`
	Noise     []float64 `json:"noise_m2_per_Hz"` // the sensor's part of Model
}

// pictures turns an album into numbers for a report.
func (t *Trial) pictures(a *effect.Album) *Pictures {
	c, p := t.config, a.Pictures()
	out := &Pictures{
		DwellsLower: bins(p.Dwells[trace.Lower]), DwellsUpper: bins(p.Dwells[trace.Upper]), Overshoots: bins(p.Overshoots),
		Spectrum: Spectrum{Segments: p.Segments, Frequency: p.Frequency, Measured: p.Spectrum},
		Expected: []Point{},
	}
	for i, s := range p.Stretch {
		if math.IsNaN(s.Measured) {
			continue // a lost tick
		}
		out.Trace.Time = append(out.Trace.Time, float64(p.Start+int64(i)*p.Every)/c.Rate)
		out.Trace.Position = append(out.Trace.Position, s.Position)
		out.Trace.Measured = append(out.Trace.Measured, s.Measured)
		out.Trace.Level = append(out.Trace.Level, int(s.Level))
	}
	for _, f := range p.Frequency {
		noise := c.noiseSpectrum(f)
		out.Spectrum.Noise = append(out.Spectrum.Noise, noise)
		out.Spectrum.Model = append(out.Spectrum.Model, noise+c.motionSpectrum(f))
	}
	if t.predicted.Barrier != nil {
		k := c.Case()
		lowest := theory.NoisyPotential(k.Well().Centre(), k.Barrier, k.Noise)
		for _, point := range t.observer.Result().Realised.Curve {
			u := point.Position / c.sigma()
			out.Expected = append(out.Expected, Point{point.Position, theory.NoisyPotential(u, k.Barrier, k.Noise) - lowest})
		}
	}
	return out
}

func bins(from []effect.Bin) []Bin {
	out := make([]Bin, len(from))
	for i, b := range from {
		out[i] = Bin(b)
	}
	return out
}

// folds is how often a spectrum is folded at the rate where a pole stands
// between motion and sampling; without one the folding is exact.
const folds = 8

// motionSpectrum is the sampled spectrum of the thermal motion behind the
// sensor's poles, one-sided, m²/Hz.
func (c Config) motionSpectrum(f float64) float64 {
	s := c.sensor()
	gain := (1 + s.GainError) * (1 + s.GainError)
	if s.Bandwidth == 0 && s.HighPass == 0 {
		return gain * c.Oscillator.SampledSpectrum(f, 1/c.Rate)
	}
	return gain * c.folded(f, func(f float64) float64 {
		h := cmplx.Abs(s.Response(f))
		return h * h * c.Oscillator.Spectrum(f)
	})
}

// noiseSpectrum is that of the sensor's noise and of its rounding to whole
// converter steps.
func (c Config) noiseSpectrum(f float64) float64 {
	s := c.sensor()
	step := s.Converter.Step()
	rounding := step * step / 12 * 2 / c.Rate
	if s.Bandwidth == 0 {
		return s.Density*s.Density + rounding
	}
	return rounding + c.folded(f, func(f float64) float64 {
		h := cmplx.Abs(s.Response(f))
		return h * h * s.Density * s.Density
	})
}

// folded adds what sampling folds to a frequency.
func (c Config) folded(f float64, of func(f float64) float64) float64 {
	sum := of(f)
	for n := 1.0; n <= folds; n++ {
		sum += of(n*c.Rate-f) + of(n*c.Rate+f)
	}
	return sum
}

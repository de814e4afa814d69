package trial_test

import (
	"context"
	"math"
	"testing"

	"brinkwell/controller/trial"
)

// The model's density integrates to the variance of what it models: the
// thermal motion's kT/k, scaled by the sensor's gain, and the noise's own. With
// a pole in the way the motion's is kT/k·b·(b+Γ)/(b·(b+Γ)+omega0²), b = 2π·f_b
// (from the moment equations of the two).
func TestModelSpectrum(t *testing.T) {
	for name, spoil := range map[string]func(*trial.Config){
		"plain":     func(*trial.Config) {},
		"gain":      func(c *trial.Config) { c.Sensor.GainError = 0.5 },
		"bandwidth": func(c *trial.Config) { c.Sensor.Bandwidth = 50e3 },
	} {
		c := demo()
		c.Duration = 0.6
		spoil(&c)
		b, err := trial.New(c)
		if err != nil {
			t.Fatal(err)
		}
		if err := b.WithPictures(); err != nil {
			t.Fatal(err)
		}
		r, err := b.Run(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		s := r.Pictures.Spectrum
		df := s.Frequency[1] - s.Frequency[0]
		var model, noise float64
		for i := range s.Model {
			model += s.Model[i] * df
			noise += s.Noise[i] * df
		}
		o := c.Oscillator
		want := o.KT / o.Stiffness * (1 + c.Sensor.GainError) * (1 + c.Sensor.GainError)
		wantNoise := r.Loop.SensorNoise * r.Loop.SensorNoise
		if f := c.Sensor.Bandwidth; f > 0 {
			corner := 2 * math.Pi * f
			want *= corner * (corner + o.Damping()) / (corner*(corner+o.Damping()) + o.Omega0*o.Omega0)
		}
		// The sum over bins 61 Hz wide of a resonance 186 Hz wide, without the bin
		// at 0; the noise's folding is cut after eight.
		if got := model - noise; !(math.Abs(got-want) < 5e-3*want) {
			t.Errorf("%s: the motion's density integrates to %.4g m², want %.4g", name, got, want)
		}
		if !(math.Abs(noise-wantNoise) < 0.01*wantNoise) {
			t.Errorf("%s: the noise's density integrates to %.4g m², want %.4g", name, noise, wantNoise)
		}
	}
}

// The measured spectrum lies on the model around the resonance and above it,
// where the jumps between the wells add little.
func TestMeasuredSpectrumIsTheModels(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	c := demo()
	c.HalfDistance *= 1.6 // hardly a jump
	b, err := trial.New(c)
	if err != nil {
		t.Fatal(err)
	}
	if err := b.WithPictures(); err != nil {
		t.Fatal(err)
	}
	r, err := b.Run(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	s := r.Pictures.Spectrum
	var ratio, n float64
	for i, f := range s.Frequency {
		if f > 3000 && f < 200e3 {
			ratio += s.Measured[i] / s.Model[i]
			n++
		}
	}
	ratio /= n
	// Averages of exponentials: 1/√(bins·2/3·segments/1.1), 1e-3 here; leakage of
	// Hann's window at the resonance adds as much.
	if se := 1 / math.Sqrt(n*2/3*float64(s.Segments)/1.1); !(math.Abs(ratio-1) < 3.5*se+2e-3) {
		t.Errorf("measured over model %.5f, want 1 ± %.5f", ratio, se)
	}
}

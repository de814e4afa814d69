package chain

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/stat"

	"brinkwell/plant/variate"
)

func sqrt(z complex128) complex128 { return cmplx.Sqrt(z) }
func exp(z complex128) complex128  { return cmplx.Exp(z) }

func newSensor(t *testing.T, c SensorConfig) *Sensor {
	t.Helper()
	s, err := NewSensor(c, variate.NewNormal(1, 0), variate.NewNormal(1, 1))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// All codes of a small converter: each for the half step below it and the half
// step above, the ends for what lies beyond, one code more below than above.
func ExampleConverter() {
	c := Converter{Bits: 2, Range: 4} // steps of 2
	for _, x := range []float64{-9, -4, -3.1, -3, -1, -0.9, 0, 0.9, 1, 2, 3, 9} {
		fmt.Print(c.Convert(x), " ")
	}
	// Output: -4 -4 -4 -2 0 0 0 0 2 2 2 2
}

// Rounding to whole steps q adds q²/12 (W.R. Bennett, Bell Syst. Tech. J. 27,
// 446 (1948)); of a normal distribution of width σ, exactly
// q²/12·(1 + 12/π²·Σ (-1)^n/n²·e^{-2π²n²σ²/q²}) (Widrow's quantising theorem;
// both from memory), from all to nothing of it as σ falls below q/2.
func TestQuantisedVariance(t *testing.T) {
	const size = 1 << 20
	draws := make([]float64, size)
	variate.NewNormal(3, 0).Fill(draws)
	for _, ratio := range []float64{2, 0.5, 0.3, 0.2} { // σ/q
		c := Converter{Bits: 16, Range: math.Ldexp(1, 15)}
		err2 := make([]float64, size)
		for i, x := range draws {
			e := c.Convert(x*ratio) - x*ratio
			err2[i] = e * e
		}
		want := 1.0
		for n := 1.0; n < 20; n++ {
			want += 12 / (math.Pi * math.Pi) * math.Pow(-1, n) / (n * n) * math.Exp(-2*math.Pi*math.Pi*n*n*ratio*ratio)
		}
		want /= 12
		mean, sd := stat.MeanStdDev(err2, nil)
		if se := sd / math.Sqrt(size); !(math.Abs(mean-want) < 3.5*se) {
			t.Errorf("σ = %v steps: rounding's variance %v, want %v ± %v", ratio, mean, want, se)
		}
	}
}

// Behind one pole white noise of one-sided density S has the variance S·π/2·f
// (the equivalent noise bandwidth of one pole is π/2·f) and the correlation
// e^{-2π·f·t}; a high-pass h behind it takes the share h/(f+h).
func TestNoiseBehindPoles(t *testing.T) {
	const size = 1 << 20
	for _, tt := range []struct{ bandwidth, high float64 }{{0, 0}, {20, 0}, {200, 0}, {20, 2}, {20, 20}} {
		c := SensorConfig{Rate: 1000, Density: 0.1, Bandwidth: tt.bandwidth, HighPass: tt.high}
		n := NewNoise(c, variate.NewNormal(5, 0))
		x := make([]float64, size)
		for i := range x {
			x[i] = n.Next()
		}
		want := c.Density * c.Density * c.Rate / 2
		decay := 0.0
		if tt.bandwidth > 0 {
			want = c.Density * c.Density * math.Pi / 2 * tt.bandwidth * tt.bandwidth / (tt.bandwidth + tt.high)
			decay = math.Exp(-2 * math.Pi * tt.bandwidth / c.Rate)
		}
		if got := c.NoiseSD() * c.NoiseSD(); !(math.Abs(got-want) < 1e-12*want) {
			t.Errorf("%+v: NoiseSD² = %v, want %v", tt, got, want)
		}
		// A variance's error: √(2·(1+ρ²)/(1-ρ²)/n) for a correlation ρ^k.
		se := want * math.Sqrt(2*(1+decay*decay)/(1-decay*decay)/size)
		if got := stat.Variance(x, nil); !(math.Abs(got-want) < 3.5*se) {
			t.Errorf("%+v: variance %v, want %v ± %v", tt, got, want, se)
		}
		if tt.high == 0 {
			if got := stat.Correlation(x[1:], x[:size-1], nil); !(math.Abs(got-decay) < 3.5*math.Sqrt((1-decay*decay)/size)+1e-9) {
				t.Errorf("%+v: neighbours correlate by %v, want %v", tt, got, decay)
			}
		}
	}
}

// The first sample is as wide as any: the noise starts in its stationary state.
func TestNoiseStartsStationary(t *testing.T) {
	c := SensorConfig{Rate: 1000, Density: 0.1, Bandwidth: 20, HighPass: 5}
	x := make([]float64, 20000)
	for seed := range x {
		x[seed] = NewNoise(c, variate.NewNormal(uint64(seed), 9)).Next()
	}
	want := c.NoiseSD() * c.NoiseSD()
	if got := stat.Variance(x, nil); !(math.Abs(got-want) < 3.5*want*math.Sqrt(2.0/20000)) {
		t.Errorf("variance of the first sample %v, want %v", got, want)
	}
}

// What is deterministic about a reading, noise and converter aside.
func TestReading(t *testing.T) {
	base := SensorConfig{Rate: 1000}
	for _, tt := range []struct {
		name  string
		spoil func(*SensorConfig)
		tick  int64
		seen  float64
		want  float64
	}{
		{"nothing", func(*SensorConfig) {}, 7, 3, 3},
		{"gain", func(c *SensorConfig) { c.GainError = 0.1 }, 7, 3, 3.3},
		{"inverted", func(c *SensorConfig) { c.Inverted, c.GainError = true, 0.1 }, 7, 3, -3.3},
		{"offset", func(c *SensorConfig) { c.Offset = 0.5 }, 7, 3, 3.5},
		{"drift", func(c *SensorConfig) { c.Drift = 2 }, 500, 3, 4},
		{"drift before the start", func(c *SensorConfig) { c.Drift = 2 }, -500, 3, 2},
		// A ramp behind a low-pass lags by its time constant, 1/(2π·50) s.
		{"drift behind a pole", func(c *SensorConfig) { c.Drift, c.Bandwidth = 2, 50 }, 500, 3, 4 - 2/(2*math.Pi*50)},
		{"offset, AC coupled", func(c *SensorConfig) { c.Offset, c.HighPass = 0.5, 1 }, 500, 3, 3},
		// … and a high-pass leaves what it gains in its own.
		{"drift, AC coupled", func(c *SensorConfig) { c.Drift, c.HighPass = 2, 1 }, 500, 3, 3 + 2/(2*math.Pi)},
		{"clipped", func(c *SensorConfig) { c.Converter.Range = 2 }, 7, 3, 2},
	} {
		c := base
		tt.spoil(&c)
		if got := newSensor(t, c).Read(tt.tick, tt.seen); !(math.Abs(got-tt.want) < 1e-12) {
			t.Errorf("%s: %v, want %v", tt.name, got, tt.want)
		}
	}
}

// Hum has its frequency, and its amplitude times the poles' |H|:
// 1/√(1+(f/f_b)²) and 1/√(1+(f_h/f)²).
func TestHum(t *testing.T) {
	c := SensorConfig{Rate: 1000, HumAmplitude: 2, HumFrequency: 50, Bandwidth: 40, HighPass: 30}
	s := newSensor(t, c)
	var sin, cos float64
	const ticks = 1000 // fifty cycles
	for tick := range int64(ticks) {
		x := s.Read(tick, 0)
		arg := 2 * math.Pi * 50 * float64(tick) / c.Rate
		sin += x * math.Sin(arg) * 2 / ticks
		cos += x * math.Cos(arg) * 2 / ticks
	}
	want := 2 / math.Sqrt(1+50.*50/40/40) / math.Sqrt(1+30.*30/50/50)
	if got := math.Hypot(sin, cos); !(math.Abs(got-want) < 1e-9) {
		t.Errorf("amplitude %v, want %v", got, want)
	}
}

func TestSticks(t *testing.T) {
	s := newSensor(t, SensorConfig{Rate: 1000, Sticks: 0.3})
	const size = 100000
	stuck, last := 0, math.NaN()
	for tick := range int64(size) {
		x := s.Read(tick, float64(tick))
		if x == last {
			stuck++
		} else if x != float64(tick) {
			t.Fatalf("tick %d reads %v, want its own or the reading before, %v", tick, x, last)
		}
		last = x
	}
	if share := float64(stuck) / size; !(math.Abs(share-0.3) < 3.5*math.Sqrt(0.3*0.7/size)) {
		t.Errorf("%v of the samples stick, want 0.3", share)
	}
}

func TestSensorRefuses(t *testing.T) {
	for name, spoil := range map[string]func(*SensorConfig){
		"noise":        func(c *SensorConfig) { c.Density = -1 },
		"bandwidth":    func(c *SensorConfig) { c.Bandwidth = math.NaN() },
		"gain error":   func(c *SensorConfig) { c.GainError = -1 },
		"sticks":       func(c *SensorConfig) { c.Sticks = 1 },
		"needs a rang": func(c *SensorConfig) { c.Converter.Bits = 8 },
		"49 bits":      func(c *SensorConfig) { c.Converter = Converter{Bits: 49, Range: 1} },
	} {
		c := SensorConfig{Rate: 1000}
		spoil(&c)
		if err := c.Validate(); err == nil {
			t.Errorf("a wrong %s passes", name)
		}
	}
}

package trial_test

import (
	"context"
	"encoding/json"
	"math"
	"testing"

	"pgregory.net/rapid"

	"brinkwell/controller/trial"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// Whatever bench the settings allow, there is a report without a NaN, every
// interval in order, and a word for what could not be estimated.
func TestAnyBenchReports(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		decade := func(low, high float64, name string) float64 {
			return math.Pow(10, rapid.Float64Range(low, high).Draw(t, name))
		}
		orZero := func(v float64, name string) float64 {
			if rapid.Bool().Draw(t, "with "+name) {
				return v
			}
			return 0
		}
		o := motion.Oscillator{Omega0: decade(0, 7, "omega0"), Quality: decade(-3, 6, "quality"), Stiffness: decade(-3, 3, "stiffness"), KT: 4e-21}
		sigma := math.Sqrt(o.KT / o.Stiffness)
		slow := math.Max(1/o.Omega0, 1/(o.Quality*o.Omega0))
		rate := decade(0.1, 3, "ticks") / slow
		x1 := sigma * math.Sqrt(2*decade(-1, 2, "barrier"))
		c := trial.Config{
			Oscillator:   o,
			Temperature:  290,
			HalfDistance: x1,
			Threshold:    orZero(0.8*x1*rapid.Float64Range(-1, 1).Draw(t, "threshold"), "threshold"),
			Rate:         rate,
			HalfBand:     orZero(0.19*x1*rapid.Float64Range(0, 1).Draw(t, "half band"), "half band"),
			Latency:      orZero(slow*decade(-3, 2, "latency"), "latency"),
			Sensor: chain.SensorConfig{
				Density:      orZero(sigma*decade(-3, 2, "noise")/math.Sqrt(rate/2), "noise"),
				Bandwidth:    orZero(decade(-1, 3, "bandwidth")/slow, "bandwidth"),
				HighPass:     orZero(decade(-5, -2, "high-pass")/slow, "high-pass"),
				GainError:    orZero(rapid.Float64Range(-0.9, 3).Draw(t, "gain error"), "gain error"),
				Inverted:     rapid.Bool().Draw(t, "inverted"),
				Offset:       orZero(sigma*rapid.Float64Range(-3, 3).Draw(t, "offset"), "offset"),
				Drift:        orZero(sigma*rate*decade(-6, -2, "drift"), "drift"),
				HumAmplitude: orZero(sigma*decade(-3, 1, "hum"), "hum"),
				HumFrequency: decade(-2, 3, "hum frequency") / slow,
				Converter:    chain.Converter{Bits: rapid.IntRange(0, 24).Draw(t, "bits"), Range: sigma * decade(-1, 2, "range")},
				Sticks:       orZero(rapid.Float64Range(0, 0.99).Draw(t, "sticks"), "sticks"),
			},
			Jitter:    orZero(slow*decade(-4, 0, "jitter"), "jitter"),
			Shape:     rapid.SampledFrom(chain.Shapes).Draw(t, "shape"),
			LostTicks: orZero(rapid.Float64Range(0, 0.99).Draw(t, "lost ticks"), "lost ticks"),
			Lag:       orZero(slow*decade(-4, 1, "lag"), "lag"),
			HoldOff:   orZero(slow*decade(-3, 1, "hold-off"), "hold-off"),
			Duration:  math.Ceil(decade(0, 4.5, "duration")) / rate,
			WarmUp:    10 / rate,
			Seed:      rapid.Uint64().Draw(t, "seed"),
			Tolerance: trial.Tolerance{Barrier: 0.1, Temperature: 0.1},
		}
		b, err := trial.New(c)
		if err != nil {
			t.Fatalf("%+v: %v", c, err)
		}
		r, err := b.Run(context.Background(), nil)
		if err != nil {
			t.Fatalf("%+v: %v", c, err)
		}
		data, err := json.Marshal(r) // fails on a NaN
		if err != nil {
			t.Fatalf("%+v: %v", c, err)
		}
		var tree any
		if err := json.Unmarshal(data, &tree); err != nil {
			t.Fatal(err)
		}
		intervals(t, "report", tree)
	})
}

// intervals checks every estimate of a report.
func intervals(t *rapid.T, path string, tree any) {
	switch v := tree.(type) {
	case []any:
		for _, e := range v {
			intervals(t, path, e)
		}
	case map[string]any:
		value, is := v["value"]
		if _, has := v["low"]; !is || !has {
			for name, e := range v {
				intervals(t, path+"."+name, e)
			}
			return
		}
		if value == nil {
			if reason, _ := v["reason"].(string); reason == "" {
				t.Fatalf("%s has neither a value nor a reason", path)
			}
			return
		}
		low, high := v["low"].(float64), v["high"].(float64)
		if x := value.(float64); !(low <= x && x <= high) {
			t.Fatalf("%s: %v is not inside (%v, %v)", path, x, low, high)
		}
	}
}

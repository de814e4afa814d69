package settings

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// The wanted values are what the Go compiler, which rounds constants once from
// exact arithmetic, makes of the same number written in SI.
func TestParseQuantity(t *testing.T) {
	tests := []struct {
		d    *dimension
		text string
		want float64
	}{
		{&frequency, "6.5 kHz", 6500},
		{&frequency, "6.5kHz", 6500},
		{&frequency, "  6.5\tkHz ", 6500},
		{&frequency, "6.5\u00a0kHz", 6500},
		{&frequency, "1 MHz", 1e6},
		{&frequency, "1 mHz", 1e-3},
		{&frequency, "1 Hz", 1},
		{&frequency, "+1.5e3 Hz", 1500},
		{&frequency, "0.1 THz", 0.1e12},
		{&frequency, "5.Hz", 5},
		{&frequency, ".5 GHz", 0.5e9},
		{&duration, "4.99e-06 s", 4.99e-06},
		{&duration, "1 ms", 1e-3},
		{&duration, "3 min", 180},
		{&duration, "0.7 min", 0.7 * 60},
		{&duration, "1.1 h", 1.1 * 3600},
		{&duration, "1e-3h", 3.6},
		{&duration, "0.3 us", 0.3e-6},
		{&duration, "0.3 \u00b5s", 0.3e-6},
		{&duration, "0.3 \u03bcs", 0.3e-6},
		{&length, "5 m", 5},
		{&length, "5 mm", 5e-3},
		{&length, "5 Mm", 5e6},
		{&length, "-1.272 nm", -1.272e-9},
		{&length, "3 pm", 3e-12},
		{&length, "3 am", 3e-18},
		{&length, "3 zm", 3e-21},
		{&length, "3 ym", 3e-24},
		{&temperature, "293.15 K", 293.15},
		{&temperature, "1.7 kK", 1700},
		{&temperature, "1.7 mK", 1.7e-3},
		{&stiffness, "0.08 N/m", 0.08},
		{&stiffness, "80 mN/m", 0.08},
		{&noiseDensity, "30 fm/rtHz", 30e-15},
		{&noiseDensity, "30 fm/√Hz", 30e-15},
		{&noiseDensity, "2 m/rtHz", 2},
		{&noiseDensity, "0 m/rtHz", 0},
		{&length, "1.7976931348623157e299 Gm", math.MaxFloat64},
	}
	for _, tt := range tests {
		if got, err := tt.d.parse(tt.text); err != nil || got != tt.want {
			t.Errorf("%q is %v, %v; want exactly %v", tt.text, got, err, tt.want)
		}
	}
}

// Multiplying what is parsed by a prefix would round twice: this pins that it
// is not done that way.
func TestParseQuantityRoundsOnce(t *testing.T) {
	femtos, femto, minutes, minute := 1.1, 1e-15, 0.03, 60.0 // variables: the compiler would round once, too
	if femtos*femto == 1.1e-15 || minutes*minute == 0.03*60 {
		t.Fatal("the examples do not tell one rounding from two")
	}
	if got, err := ParseQuantity[Metre]("1.1 fm"); err != nil || got != 1.1e-15 {
		t.Errorf("1.1 fm is %v, %v", float64(got), err)
	}
	if got, err := ParseQuantity[Second]("0.03 min"); err != nil || got != 0.03*60 {
		t.Errorf("0.03 min is %v, %v", float64(got), err)
	}
	if got := FormatQuantity(Second(0.03)); got != "30 ms" {
		t.Errorf("0.03 s is written %s", got)
	}
}

func TestParseQuantityRefuses(t *testing.T) {
	tests := []struct {
		d    *dimension
		text string
		want string // a fragment of the message
	}{
		{&frequency, "", "needs a decimal number and a unit"},
		{&frequency, "kHz", "needs a decimal number and a unit"},
		{&frequency, "6500", `a frequency needs a unit, such as "6.5 kHz"`},
		{&frequency, "5 N/m", `"N/m" is not a unit for a frequency`},
		{&frequency, "5 khz", `"kHz"`},
		{&frequency, "5 mhz", `"mHz" or "MHz"`},
		{&frequency, "5 kkHz", "not a unit"},
		{&frequency, "5 k", "not a unit"},
		{&frequency, "5 PHz", "not a unit"},
		{&frequency, "010 Hz", "not a unit"},
		{&frequency, "0x1p3 Hz", "not a unit"},
		{&frequency, "1_000 Hz", "not a unit"},
		{&frequency, "1,5 kHz", "not a unit"},
		{&frequency, "nan Hz", "decimal number"},
		{&frequency, "inf Hz", "decimal number"},
		{&frequency, "Infinity Hz", "decimal number"},
		{&frequency, "1e999 Hz", "too large"},
		{&frequency, "1e300 THz", "too large"},
		{&frequency, "-1e999 Hz", "too large"},
		{&frequency, "1e99999999999999999999 Hz", "exponent"},
		{&duration, "1e308 min", "too large"},
		{&duration, "1e-999 s", "too small"},
		{&duration, "1e-310 fs", "too small"},
		{&duration, "5 m", "not a unit"},
		{&duration, "5 kmin", "not a unit"},
		{&duration, "5 mh", "not a unit"},
		{&duration, "5 H", `"h"`},
		{&duration, "5 d", "not a unit"},
		{&length, "5 min", "not a unit"},
		{&length, "5 cm", "not a unit"},
		{&length, "5 pam", "not a unit"},
		{&temperature, "20 °C", "not a unit"},
		{&temperature, "20 k", `"K"`},
		{&stiffness, "5 N/mm", "not a unit"},
		{&stiffness, "5 Pa", "not a unit"},
		{&noiseDensity, "30 fm", "not a unit"},
		{&noiseDensity, "30 fm/Hz", "not a unit"},
	}
	for _, tt := range tests {
		got, err := tt.d.parse(tt.text)
		if err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%q is %v, %v; want an error with %q", tt.text, got, err, tt.want)
		}
	}
}

func TestFormatQuantity(t *testing.T) {
	tests := []struct {
		d    *dimension
		v    float64
		want string
	}{
		{&frequency, 6500, "6.5 kHz"},
		{&frequency, 1e6, "1 MHz"},
		{&frequency, 999999, "999.999 kHz"},
		{&frequency, 1e16, "10000 THz"},
		{&stiffness, 0.08, "80 mN/m"},
		{&noiseDensity, 30e-15, "30 fm/rtHz"},
		{&temperature, 293.15, "293.15 K"},
		{&temperature, 1e5, "100000 K"},
		{&duration, 60, "60 s"},
		{&duration, 3600, "3600 s"},
		{&duration, 1e20, "1e20 s"},
		{&duration, 4.99e-6, "4.99 us"},
		{&length, 0, "0 m"},
		{&length, -1.5e-9, "-1.5 nm"},
		{&length, -123e-9, "-123 nm"},
		{&length, 1.5e-30, "1.5e-6 ym"},
		{&length, math.NaN(), "NaN m"},
		{&length, math.Inf(1), "+Inf m"},
	}
	for _, tt := range tests {
		if got := tt.d.format(tt.v); got != tt.want {
			t.Errorf("%v is written %q, want %q", tt.v, got, tt.want)
		}
	}
}

func TestFormatQuantityIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(-math.MaxFloat64, math.MaxFloat64).Draw(t, "v")
		if v == 0 {
			v = 0 // -0 is written without its sign
		}
		for _, d := range []*dimension{&frequency, &duration, &noiseDensity} {
			text := d.format(v)
			if got, err := d.parse(text); err != nil || got != v {
				t.Fatalf("%v was written %q and read as %v, %v", v, text, got, err)
			}
		}
	})
}

func FuzzParseQuantity(f *testing.F) {
	for _, text := range []string{
		"6.5 kHz", "30 fm/rtHz", "0.3 µs", "1.1 h", "1e999 Hz", "1e-999 min", "-0 m", "010 K", "5 Pa", "1e9999999999 s", ".e5 N/m", "",
	} {
		f.Add(text)
	}
	all := []*dimension{&frequency, &duration, &length, &temperature, &stiffness, &noiseDensity}
	f.Fuzz(func(t *testing.T, text string) {
		for _, d := range all {
			v, err := d.parse(text)
			if err != nil {
				continue
			}
			if math.IsNaN(v) || math.IsInf(v, 0) || (v == 0 && math.Signbit(v)) {
				t.Fatalf("%q was read as %v", text, v)
			}
			if again, err := d.parse(d.format(v)); err != nil || again != v {
				t.Fatalf("%q was read as %v, written %q, and read as %v, %v", text, v, d.format(v), again, err)
			}
		}
	})
}

package draw

import (
	"bytes"
	"context"
	"encoding/xml"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"brinkwell/controller/trial"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// report is a short demo's, with what its pictures show.
func report(t testing.TB, seconds float64) trial.Report {
	t.Helper()
	o := motion.Oscillator{Omega0: 2 * math.Pi * 6500, Quality: 35, Stiffness: 0.08, KT: 1.380649e-23 * 293.15}
	b, err := trial.New(trial.Config{
		Oscillator: o, Temperature: 293.15, HalfDistance: math.Sqrt(8 * o.KT / o.Stiffness), Rate: 1e6, HalfBand: 0.02e-9, Latency: 1e-6,
		Sensor: chain.SensorConfig{Density: 30e-15}, Duration: seconds, WarmUp: 0.017, Seed: 1,
		Tolerance: trial.Tolerance{Barrier: 0.1, Temperature: 0.05},
	})
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
	return r
}

// Every picture is there twice, opens, says what it is to those who cannot see
// it, has its axes named with units and its lines in words, and comes out the
// same from the same report.
func TestSave(t *testing.T) {
	r := report(t, 3)
	first, second := t.TempDir(), t.TempDir()
	names, err := Save(first, r, "caption of the sheet")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Save(second, r, "caption of the sheet"); err != nil {
		t.Fatal(err)
	}
	words := map[string][]string{
		"landscape.svg":  {"position / nm", "energy / kT", "asked", "realised", "95 % interval", "threshold"},
		"trace.svg":      {"position / nm", " / ms", "measured", "true", "wells", "level, up or down"},
		"dwells.svg":     {"time in the well / ms", "lower well", "upper well", "exponential"},
		"overshoots.svg": {"overshoot / pm", "actuations", "mean", "threshold"},
		"spectrum.svg":   {"frequency / Hz", "(m²/Hz)", "measured", "thermal, one well", "sensor noise"},
		"sheet.svg":      {"caption of the sheet", "energy / kT", "frequency / Hz"},
	}
	if len(names) != 2*len(words) {
		t.Errorf("%d files, want %d", len(names), 2*len(words))
	}
	for _, name := range names {
		data, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		base := filepath.Base(name)
		again, err := os.ReadFile(filepath.Join(second, base))
		if err != nil || !bytes.Equal(data, again) {
			t.Errorf("%s differs from one time to the next (%v)", base, err)
		}
		if strings.HasSuffix(base, ".png") {
			if img, err := png.Decode(bytes.NewReader(data)); err != nil || img.Bounds().Dx() < 800 {
				t.Errorf("%s: %v, want a picture of at least 800 dots", base, err)
			}
			continue
		}
		text := svgText(t, base, data)
		for _, w := range append(words[base], "title", "desc") {
			if !strings.Contains(text, w) {
				t.Errorf("%s lacks %q", base, w)
			}
		}
	}
}

// svgText returns an SVG's texts and element names; it must be well formed.
func svgText(t *testing.T, name string, data []byte) string {
	t.Helper()
	var b strings.Builder
	d := xml.NewDecoder(bytes.NewReader(data))
	for {
		token, err := d.Token()
		if token == nil {
			break
		}
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		switch v := token.(type) {
		case xml.CharData:
			b.Write(v)
		case xml.StartElement:
			b.WriteString(" " + v.Name.Local + " ")
		}
	}
	return b.String()
}

// A report with nothing in it is drawn in words.
func TestNothingToDraw(t *testing.T) {
	for name, r := range map[string]trial.Report{"nothing": {}, "no pictures": {Pictures: &trial.Pictures{}}, "a tick": report(t, 1e-6)} {
		if _, err := Save(t.TempDir(), r, ""); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestUnwritableDirectory(t *testing.T) {
	if _, err := Save(filepath.Join(t.TempDir(), "missing"), trial.Report{}, ""); err == nil || !strings.Contains(err.Error(), "missing") {
		t.Errorf("got %v, want an error that names the file", err)
	}
}

// The outline of a histogram encloses as many counts as there are; the
// exponential puts the share of its cumulative distribution into the bins.
func TestHistogramShapes(t *testing.T) {
	bins := []trial.Bin{{From: 0, To: 1, Count: 60}, {From: 1, To: 2, Count: 30}, {From: 2, To: 4, Count: 10}}
	points := outline(bins, 2)
	area := 0.0
	for i := 1; i < len(points); i++ {
		area += (points[i].X - points[i-1].X) * points[i].Y
	}
	if want := 2.0*60 + 2.0*30 + 4.0*10; area != want {
		t.Errorf("the outline encloses %v, want %v", area, want)
	}
	sum := 0.0
	for _, p := range exponential(bins, 1.5, 1) {
		sum += p.Y
	}
	if want := 100 * (1 - math.Exp(-4/1.5)); !(math.Abs(sum-want) < 1e-9) {
		t.Errorf("the exponential puts %v of 100 into the bins, want %v", sum, want)
	}
	many := make([]trial.Bin, 100)
	for i := range many {
		many[i] = trial.Bin{From: float64(i), To: float64(i + 1), Count: int64(i % 2)}
	}
	few := merged(many, 30)
	if total(few) != total(many) || len(few) > 30 || few[len(few)-1].To != 100 {
		t.Errorf("%v counts in %d bins up to %v, want %v in at most 30 up to 100", total(few), len(few), few[len(few)-1].To, total(many))
	}
}

// In grey, what must be told apart differs by at least 20 of 100 in lightness
// L* (CIE 1976, from the relative luminance of IEC 61966-2-1's sRGB).
func TestColoursDifferInGrey(t *testing.T) {
	lightness := func(c interface {
		RGBA() (r, g, b, a uint32)
	},
	) float64 {
		r, g, b, _ := c.RGBA()
		y := 0.0
		for i, v := range []uint32{r, g, b} {
			s := float64(v) / 0xffff
			if s <= 0.04045 {
				s /= 12.92
			} else {
				s = math.Pow((s+0.055)/1.055, 2.4)
			}
			y += s * []float64{0.2126, 0.7152, 0.0722}[i]
		}
		return 116*math.Cbrt(y) - 16
	}
	l := []float64{lightness(deep), lightness(bright), lightness(mist)}
	for i := 1; i < len(l); i++ {
		if !(l[i]-l[i-1] >= 20) {
			t.Errorf("lightness %.0f beside %.0f: too close in grey", l[i], l[i-1])
		}
	}
}

func BenchmarkSave(b *testing.B) {
	r := report(b, 3)
	dir := b.TempDir()
	for b.Loop() {
		if _, err := Save(dir, r, ""); err != nil {
			b.Fatal(err)
		}
	}
}

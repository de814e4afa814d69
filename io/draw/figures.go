package draw

import (
	"fmt"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/plotter"
	"gonum.org/v1/plot/vg/draw"

	"brinkwell/controller/trial"
)

// A Figure is one picture of a report.
type Figure struct {
	Name        string // of its file, without an ending
	Title       string
	Description string // in words, for those who do not see it
	draw        func() (*plot.Plot, error)
}

// Figures returns the pictures of a report that holds what they show.
func Figures(r trial.Report) []Figure {
	return []Figure{
		{
			"landscape", "Potential",
			"Potential energy in kT over the position: the double well that was asked, dashed, and the one that was realised, drawn through, with its 95 % band.",
			func() (*plot.Plot, error) { return landscapeFigure(r) },
		},
		{
			"trace", "A stretch of the run",
			"Position over time around an actuation, above a strip that shows which level was decided.",
			func() (*plot.Plot, error) { return traceFigure(r) },
		},
		{
			"dwells", "Settled dwell times",
			"Histogram of the settled dwell times in the lower and the upper well, with the exponential distributions of the same means.",
			func() (*plot.Plot, error) { return dwellsFigure(r) },
		},
		{
			"overshoots", "Overshoot at the actuation",
			"Histogram of how far beyond the threshold the resonator was when a new level acted, with the mean.",
			func() (*plot.Plot, error) { return overshootsFigure(r) },
		},
		{
			"spectrum", "Spectrum of the measured position",
			"Spectral density of the measured position over frequency, with that of a thermal resonator in one well, sampled alike, and the sensor's noise.",
			func() (*plot.Plot, error) { return spectrumFigure(r) },
		},
	}
}

// xy returns points scaled, leaving out what is no finite number.
func xy(x, y []float64, fx, fy float64) plotter.XYs {
	points := make(plotter.XYs, 0, len(x))
	for i := range x {
		px, py := x[i]*fx, y[i]*fy
		if !math.IsNaN(px) && !math.IsNaN(py) && !math.IsInf(px, 0) && !math.IsInf(py, 0) {
			points = append(points, plotter.XY{X: px, Y: py})
		}
	}
	return points
}

// line adds a line to a plot and, under a name, to its legend.
func line(p *plot.Plot, points plotter.XYs, style draw.LineStyle, name string) error {
	if len(points) < 2 {
		return nil
	}
	l, err := plotter.NewLine(points)
	if err != nil {
		return err
	}
	l.LineStyle = style
	p.Add(l)
	if name != "" {
		p.Legend.Add(name, l)
	}
	return nil
}

// landscapeFigure draws the potential.
func landscapeFigure(r trial.Report) (*plot.Plot, error) {
	curve := r.Realised.Curve
	if len(curve) == 0 {
		return inWords("Potential", "no part of the landscape was visited long enough"), nil
	}
	ceiling := 1.6 * math.Max(r.Asked.BarrierLower, r.Asked.BarrierUpper)
	factor, unit := lengthUnit(math.Abs(curve[0].Position))
	p := newPlot("Potential", "position / "+unit, "energy / kT")
	var asked, realised, upper, lower plotter.XYs
	for _, c := range curve {
		x := c.Position * factor
		if c.Asked <= ceiling {
			asked = append(asked, plotter.XY{X: x, Y: c.Asked})
		}
		if e := c.Energy; e.Known() && e.Value <= ceiling {
			realised = append(realised, plotter.XY{X: x, Y: e.Value})
			upper = append(upper, plotter.XY{X: x, Y: math.Min(e.High, 1.15*ceiling)})
			lower = append(lower, plotter.XY{X: x, Y: e.Low})
		}
	}
	if len(realised) > 1 {
		band := append(plotter.XYs{}, upper...)
		for i := len(lower) - 1; i >= 0; i-- {
			band = append(band, lower[i])
		}
		polygon, err := plotter.NewPolygon(band)
		if err != nil {
			return nil, err
		}
		polygon.Color, polygon.LineStyle.Width = mist, 0
		p.Add(polygon)
		p.Legend.Add("95 % interval", polygon)
	}
	x0 := r.Asked.Threshold * factor
	if err := line(p, plotter.XYs{{X: x0, Y: 0}, {X: x0, Y: ceiling}}, dotted(rule, 1), "threshold"); err != nil {
		return nil, err
	}
	if err := line(p, asked, dashed(ink, 1.2), "asked"); err != nil {
		return nil, err
	}
	if err := line(p, realised, solid(deep, 1.8), "realised"); err != nil {
		return nil, err
	}
	if r.Pictures != nil {
		var expected plotter.XYs
		for _, e := range r.Pictures.Expected {
			if e.Energy <= ceiling {
				expected = append(expected, plotter.XY{X: e.Position * factor, Y: e.Energy})
			}
		}
		if err := line(p, expected, dotted(bright, 2), "expected"); err != nil {
			return nil, err
		}
	}
	p.Y.Min, p.Y.Max = math.Min(0, p.Y.Min), ceiling*1.45 // room for the legend
	return p, nil
}

// traceFigure draws a stretch of the run with the level below it.
func traceFigure(r trial.Report) (*plot.Plot, error) {
	const title = "A stretch of the run"
	if r.Pictures == nil || len(r.Pictures.Trace.Time) < 2 {
		return inWords(title, "the run was too short for one"), nil
	}
	t := r.Pictures.Trace
	factor, unit := lengthUnit(r.Asked.Distance)
	seconds, timeUnit := timeUnit(t.Time[len(t.Time)-1] - t.Time[0])
	p := newPlot(title, fmt.Sprintf("time after %.6g s / %s", t.Time[0], timeUnit), "position / "+unit)
	shifted := make([]float64, len(t.Time))
	for i := range shifted {
		shifted[i] = t.Time[i] - t.Time[0]
	}
	end := shifted[len(shifted)-1] * seconds
	if err := line(p, xy(shifted, t.Measured, seconds, factor), solid(mist, 1.6), "measured"); err != nil {
		return nil, err
	}
	for _, ref := range []struct {
		at    float64
		style draw.LineStyle
		name  string
	}{
		{r.Asked.Threshold, dotted(rule, 1), "threshold"},
		{r.Asked.Distance / 2, dashed(rule, 0.8), "wells"},
		{-r.Asked.Distance / 2, dashed(rule, 0.8), ""},
	} {
		if err := line(p, plotter.XYs{{X: 0, Y: ref.at * factor}, {X: end, Y: ref.at * factor}}, ref.style, ref.name); err != nil {
			return nil, err
		}
	}
	if err := line(p, xy(shifted, t.Position, seconds, factor), solid(deep, 1.1), "true"); err != nil {
		return nil, err
	}
	lowest, highest := p.Y.Min, p.Y.Max
	strip := (highest - lowest) * 0.1
	if err := line(p, steps(shifted, t.Level, seconds, lowest-1.9*strip, strip), solid(bright, 1.4), "level, up or down"); err != nil {
		return nil, err
	}
	p.Y.Max = highest + 0.45*(highest-lowest) // room for the legend
	return p, nil
}

// steps returns the level over time as a line with corners, between base and
// base + height.
func steps(time []float64, level []int, factor, base, height float64) plotter.XYs {
	var points plotter.XYs
	for i := range time {
		y := base + height*float64(level[i])
		if n := len(points); n > 0 && points[n-1].Y != y {
			points = append(points, plotter.XY{X: time[i] * factor, Y: points[n-1].Y})
		}
		if n := len(points); n == 0 || points[n-1].Y != y || i == len(time)-1 {
			points = append(points, plotter.XY{X: time[i] * factor, Y: y})
		}
	}
	return points
}

// spectrumFigure draws the spectrum on two logarithmic axes.
func spectrumFigure(r trial.Report) (*plot.Plot, error) {
	const title = "Spectrum of the measured position"
	if r.Pictures == nil || r.Pictures.Spectrum.Segments == 0 {
		return inWords(title, "the run was too short for one"), nil
	}
	s := r.Pictures.Spectrum
	p := newPlot(title, "frequency / Hz", "spectral density / (m²/Hz)")
	p.X.Scale, p.Y.Scale = plot.LogScale{}, plot.LogScale{}
	p.X.Tick.Marker, p.Y.Tick.Marker = decades{}, decades{}
	positive := func(y []float64) plotter.XYs {
		points := make(plotter.XYs, 0, len(y))
		last := math.Inf(-1)
		for i, v := range y {
			// Two hundred points a decade are more than paper shows.
			if at := math.Log10(s.Frequency[i]); v > 0 && at-last >= 0.005 {
				points = append(points, plotter.XY{X: s.Frequency[i], Y: v})
				last = at
			}
		}
		return points
	}
	if err := line(p, positive(s.Measured), solid(deep, 1.1), fmt.Sprintf("measured, %d segments", s.Segments)); err != nil {
		return nil, err
	}
	if err := line(p, positive(s.Model), dashed(bright, 1.6), "thermal, one well, sampled, with noise"); err != nil {
		return nil, err
	}
	if err := line(p, positive(s.Noise), dotted(ink, 1.2), "sensor noise"); err != nil {
		return nil, err
	}
	p.Y.Max *= 30 // room for the legend
	return p, nil
}

// decades puts ticks at powers of ten, labelled where there is room.
type decades struct{}

// Ticks is gonum/plot's Ticker.
func (decades) Ticks(low, high float64) []plot.Tick {
	first, last := int(math.Floor(math.Log10(low))), int(math.Ceil(math.Log10(high)))
	every := max(1, (last-first)/5)
	var ticks []plot.Tick
	for k := first; k <= last; k++ {
		t := plot.Tick{Value: math.Pow10(k)}
		if t.Value < low*(1-1e-9) || t.Value > high*(1+1e-9) {
			continue
		}
		if (k-first)%every == 0 {
			t.Label = power(k)
		}
		ticks = append(ticks, t)
	}
	return ticks
}

// power writes ten to a power.
func power(k int) string {
	if k >= 0 && k <= 4 {
		return fmt.Sprint(int(math.Pow10(k)))
	}
	return fmt.Sprintf("1e%d", k)
}

// timeUnit returns the prefix of a second in which a time reads well, and the
// factor from seconds to it.
func timeUnit(seconds float64) (factor float64, unit string) {
	for _, u := range []struct {
		factor float64
		unit   string
	}{{1, "s"}, {1e3, "ms"}, {1e6, "µs"}} {
		if seconds*u.factor >= 1 {
			return u.factor, u.unit
		}
	}
	return 1e9, "ns"
}

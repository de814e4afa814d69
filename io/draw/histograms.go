package draw

import (
	"fmt"
	"image/color"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/plotter"

	"brinkwell/controller/trial"
)

// outline returns a histogram's bins as a line with corners, counts over the
// position of the ends.
func outline(bins []trial.Bin, factor float64) plotter.XYs {
	points := plotter.XYs{{X: bins[0].From * factor}}
	for _, b := range bins {
		points = append(points, plotter.XY{X: b.From * factor, Y: float64(b.Count)}, plotter.XY{X: b.To * factor, Y: float64(b.Count)})
	}
	return append(points, plotter.XY{X: bins[len(bins)-1].To * factor})
}

func total(bins []trial.Bin) float64 {
	n := 0.0
	for _, b := range bins {
		n += float64(b.Count)
	}
	return n
}

// merged joins neighbouring bins until there are at most so many.
func merged(bins []trial.Bin, most int) []trial.Bin {
	each := (len(bins) + most - 1) / most
	var out []trial.Bin
	for i := 0; i < len(bins); i += each {
		b := trial.Bin{From: bins[i].From, To: bins[min(i+each, len(bins))-1].To}
		for _, one := range bins[i:min(i+each, len(bins))] {
			b.Count += one.Count
		}
		out = append(out, b)
	}
	return out
}

// trimmed leaves out the empty bins at both ends, but one.
func trimmed(bins []trial.Bin) []trial.Bin {
	first, last := 0, len(bins)
	for first < last && bins[first].Count == 0 {
		first++
	}
	for last > first && bins[last-1].Count == 0 {
		last--
	}
	return bins[max(0, first-1):min(len(bins), last+1)]
}

// dwellsFigure draws the settled dwell times on either side.
func dwellsFigure(r trial.Report) (*plot.Plot, error) {
	const title = "Settled dwell times"
	if r.Pictures == nil || total(r.Pictures.DwellsLower)+total(r.Pictures.DwellsUpper) == 0 {
		return inWords(title, "no transition settled in the run"), nil
	}
	longest := 0.0
	for _, bins := range [][]trial.Bin{r.Pictures.DwellsLower, r.Pictures.DwellsUpper} {
		if len(bins) > 0 {
			longest = math.Max(longest, bins[len(bins)-1].To)
		}
	}
	factor, unit := timeUnit(longest)
	p := newPlot(title, "time in the well / "+unit, "transitions a bin")
	for _, side := range []struct {
		name  string
		bins  []trial.Bin
		mean  float64
		color color.Color
		known bool
	}{
		{"lower well", r.Pictures.DwellsLower, r.Crossings.MeanDwellLower.Value, deep, r.Crossings.MeanDwellLower.Known()},
		{"upper well", r.Pictures.DwellsUpper, r.Crossings.MeanDwellUpper.Value, bright, r.Crossings.MeanDwellUpper.Known()},
	} {
		n := total(side.bins)
		if n == 0 {
			continue
		}
		if err := line(p, outline(side.bins, factor), solid(side.color, 1.3), fmt.Sprintf("%s, %.0f", side.name, n)); err != nil {
			return nil, err
		}
		if err := errorBars(p, side.bins, side.color, factor); err != nil {
			return nil, err
		}
		if !side.known {
			continue
		}
		if err := line(p, exponential(side.bins, side.mean, factor), dashed(side.color, 1.1), side.name+": exponential of the same mean"); err != nil {
			return nil, err
		}
	}
	p.Y.Min, p.Y.Max = 0, p.Y.Max*1.35 // room for the legend
	return p, nil
}

// errorBars adds the standard errors of the counts, their square roots.
func errorBars(p *plot.Plot, bins []trial.Bin, c color.Color, factor float64) error {
	type counts struct {
		plotter.XYs
		plotter.YErrors
	}
	var e counts
	for _, b := range bins {
		if b.Count > 0 {
			root := math.Sqrt(float64(b.Count))
			e.XYs = append(e.XYs, plotter.XY{X: (b.From + b.To) / 2 * factor, Y: float64(b.Count)})
			e.YErrors = append(e.YErrors, struct{ Low, High float64 }{root, root})
		}
	}
	bars, err := plotter.NewYErrorBars(e)
	if err != nil {
		return err
	}
	bars.LineStyle, bars.CapWidth = solid(c, 0.7), 0
	p.Add(bars)
	return nil
}

// exponential returns the counts that an exponential distribution of a mean
// puts into bins as wide as these, over their middles.
func exponential(bins []trial.Bin, mean, factor float64) plotter.XYs {
	n := total(bins)
	points := make(plotter.XYs, len(bins))
	for i, b := range bins {
		share := math.Exp(-b.From/mean) - math.Exp(-b.To/mean)
		points[i] = plotter.XY{X: (b.From + b.To) / 2 * factor, Y: n * share}
	}
	return points
}

// overshootsFigure draws how far beyond the threshold actuations were.
func overshootsFigure(r trial.Report) (*plot.Plot, error) {
	const title = "Overshoot at the actuation"
	if r.Pictures == nil || total(r.Pictures.Overshoots) == 0 {
		return inWords(title, "no actuation in the run"), nil
	}
	bins := merged(trimmed(r.Pictures.Overshoots), 60)
	factor, unit := lengthUnit(math.Max(math.Abs(bins[0].From), bins[len(bins)-1].To))
	p := newPlot(title, "overshoot / "+unit, "actuations a bin")
	points := outline(bins, factor)
	if err := line(p, points, solid(deep, 1.3), fmt.Sprintf("%.0f actuations", total(bins))); err != nil {
		return nil, err
	}
	highest := p.Y.Max
	if m := r.Crossings.Overshoot; m.Known() {
		at := m.Value * factor
		if err := line(p, plotter.XYs{{X: at, Y: 0}, {X: at, Y: highest}}, dashed(bright, 1.6), "mean"); err != nil {
			return nil, err
		}
	}
	if err := line(p, plotter.XYs{{X: 0, Y: 0}, {X: 0, Y: highest}}, dotted(rule, 1), "threshold"); err != nil {
		return nil, err
	}
	p.Y.Min, p.Y.Max = 0, p.Y.Max*1.35 // room for the legend
	return p, nil
}

// Package draw turns results into pictures: one code path for reports and for
// the page. It computes nothing that a report does not hold, and it may import
// only controller packages.
package draw

import (
	"fmt"
	"math"
	"strings"

	"github.com/guptarohit/asciigraph"
)

// A Curve is a potential to draw, kT over metres, at evenly spaced positions;
// energies that are not known are NaN.
type Curve struct {
	Name   string
	Energy []float64
}

// A TerminalPlot says how a landscape is drawn with characters.
type TerminalPlot struct {
	Left, Right float64 // the positions of the first and the last energy, m
	Ceiling     float64 // kT; what lies above is left out
	Width       int     // of the plot, in characters
	Height      int     // in lines
	Color       bool    // whether the terminal shows colours
}

// The asked curve is dotted and the realised one drawn through, so that no
// colour is needed to tell them apart.
var curveChars = []asciigraph.CharSet{asciigraph.CreateCharSet("·"), asciigraph.DefaultCharSet}

var curveSigns = []string{"···", "───"}

// Landscape returns the potentials over the position as lines of text,
// positions in nanometres or whatever prefix suits. It takes two curves at most.
func (t TerminalPlot) Landscape(curves ...Curve) string {
	data := make([][]float64, 0, len(curves))
	legend := ""
	highest := 0.0
	for _, c := range curves {
		shown := make([]float64, len(c.Energy))
		for i, e := range c.Energy {
			if e > t.Ceiling {
				e = math.NaN()
			}
			// A bottom just below the fitted one is less than a line of text.
			e = math.Max(e, 0)
			shown[i] = e
			if e > highest {
				highest = e
			}
		}
		data = append(data, shown)
		legend += "   " + curveSigns[len(data)-1] + " " + c.Name
	}
	if highest == 0 {
		return "no part of the landscape was visited long enough to draw it\n"
	}
	factor, unit := lengthUnit(math.Max(math.Abs(t.Left), math.Abs(t.Right)))
	options := []asciigraph.Option{
		asciigraph.Width(t.Width),
		asciigraph.Height(t.Height),
		asciigraph.LowerBound(0),
		asciigraph.Precision(1),
		asciigraph.SeriesChars(curveChars[:len(curves)]...),
		asciigraph.XAxisRange(t.Left*factor, t.Right*factor),
		asciigraph.XAxisTickCount(5),
		asciigraph.XAxisValueFormatter(func(x float64) string { return fmt.Sprintf("%.2f", x) }),
	}
	if t.Color {
		options = append(options, asciigraph.SeriesColors(asciigraph.Default, asciigraph.Blue))
	}
	plot := strings.TrimRight(asciigraph.PlotMany(data, options...), "\n")
	return fmt.Sprintf("  energy / kT over position / %s%s\n%s\n", unit, legend, plot)
}

// lengthUnit returns the prefix of a metre in which a length reads well, and
// the factor from metres to it.
func lengthUnit(metres float64) (factor float64, unit string) {
	for _, u := range []struct {
		factor float64
		unit   string
	}{{1, "m"}, {1e3, "mm"}, {1e6, "µm"}, {1e9, "nm"}, {1e12, "pm"}} {
		if metres*u.factor >= 0.5 {
			return u.factor, u.unit
		}
	}
	return 1e15, "fm"
}

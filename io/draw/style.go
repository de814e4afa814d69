package draw

import (
	"image/color"
	"math"
	"strconv"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// The colours differ in lightness as much as in hue, so that a grey print and
// any eye tells them apart; what they mean is told by dashes and marks, too.
var (
	ink    = color.RGBA{R: 0x22, G: 0x22, B: 0x22, A: 0xff} // axes, text, what was asked
	deep   = color.RGBA{R: 0x12, G: 0x3f, B: 0x7a, A: 0xff} // what was realised
	bright = color.RGBA{R: 0xd9, G: 0x76, B: 0x1e, A: 0xff} // what is expected
	mist   = color.RGBA{R: 0xc3, G: 0xd3, B: 0xe8, A: 0xff} // bands, and what noise hides
	rule   = color.RGBA{R: 0xa0, G: 0xa0, B: 0xa0, A: 0xff} // reference lines
)

func solid(c color.Color, width float64) draw.LineStyle {
	return draw.LineStyle{Color: c, Width: vg.Points(width)}
}

func dashed(c color.Color, width float64) draw.LineStyle {
	return draw.LineStyle{Color: c, Width: vg.Points(width), Dashes: []vg.Length{vg.Points(5), vg.Points(3)}}
}

func dotted(c color.Color, width float64) draw.LineStyle {
	return draw.LineStyle{Color: c, Width: vg.Points(width), Dashes: []vg.Length{vg.Points(1.2), vg.Points(2.2)}}
}

// sans is the typeface of all text.
func sans(size float64) font.Font {
	return font.Font{Typeface: plot.DefaultFont.Typeface, Variant: "Sans", Size: font.Length(size)}
}

// plainTicks are the usual ticks, labelled without trailing zeros.
type plainTicks struct{}

// Ticks is gonum/plot's Ticker.
func (plainTicks) Ticks(low, high float64) []plot.Tick {
	ticks := plot.DefaultTicks{}.Ticks(low, high)
	for i := range ticks {
		if ticks[i].Label != "" {
			ticks[i].Label = strconv.FormatFloat(math.Round(ticks[i].Value*1e9)/1e9, 'g', 6, 64)
		}
	}
	return ticks
}

// newPlot makes an empty plot in the house's style. Its axes stand apart from
// the data on the left and below.
func newPlot(title, x, y string) *plot.Plot {
	p := plot.New()
	p.BackgroundColor = color.White
	p.Title.Text, p.X.Label.Text, p.Y.Label.Text = title, x, y
	p.Title.TextStyle.Font = sans(11)
	p.Title.Padding = vg.Points(6)
	for _, axis := range []*plot.Axis{&p.X, &p.Y} {
		axis.Label.TextStyle.Font = sans(9.5)
		axis.Tick.Label.Font = sans(8.5)
		axis.Tick.Marker = plainTicks{}
		axis.LineStyle = solid(ink, 0.7)
		axis.Tick.LineStyle = solid(ink, 0.7)
		axis.Padding = vg.Points(4)
	}
	p.Legend.TextStyle.Font = sans(8.5)
	p.Legend.XOffs = -vg.Points(3)
	p.Legend.ThumbnailWidth = vg.Points(24)
	p.Legend.Padding = vg.Points(1)
	p.Legend.Top = true
	return p
}

// inWords makes a plot that says why there is nothing to draw.
func inWords(title, why string) *plot.Plot {
	p := newPlot(title, "", "")
	p.HideAxes()
	p.Title.Text = title + "\n\n" + why
	return p
}

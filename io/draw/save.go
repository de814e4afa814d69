package draw

import (
	"bytes"
	"fmt"
	"html"
	"io"
	"os"
	"path/filepath"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"

	"brinkwell/controller/trial"
)

// Sizes on paper.
const (
	figureWidth  = 15 * vg.Centimeter
	figureHeight = 10 * vg.Centimeter
	sheetWidth   = 29.7 * vg.Centimeter // A4, landscape
	sheetHeight  = 21 * vg.Centimeter
	dotsPerInch  = 150
)

// Save writes the pictures of a report into a directory, each as SVG and PNG,
// and one sheet with all of them under a headline and a caption. It returns
// the names of the files.
func Save(dir string, r trial.Report, caption string) ([]string, error) {
	figures := Figures(r)
	var names []string
	plots := make([]*plot.Plot, len(figures))
	for i, f := range figures {
		p, err := f.draw()
		if err != nil {
			return names, fmt.Errorf("draw: %s: %w", f.Name, err)
		}
		plots[i] = p
		one := sheet{width: figureWidth, height: figureHeight, paint: framed(p), title: f.Title, description: f.Description}
		written, err := one.save(filepath.Join(dir, f.Name))
		names = append(names, written...)
		if err != nil {
			return names, err
		}
	}
	all := sheet{
		width: sheetWidth, height: sheetHeight, title: "The double well that the loop made",
		description: "All pictures of the report: " + strings.Join(titles(figures), ", ") + ".",
		paint:       func(c draw.Canvas) { paintSheet(c, plots, caption) },
	}
	written, err := all.save(filepath.Join(dir, "sheet"))
	return append(names, written...), err
}

// framed draws a plot with white space around it.
func framed(p *plot.Plot) func(draw.Canvas) {
	return func(c draw.Canvas) {
		c.SetColor(p.BackgroundColor)
		c.Fill(c.Rectangle.Path())
		const edge = 8
		p.Draw(draw.Crop(c, edge, -edge, edge, -edge))
	}
}

func titles(figures []Figure) []string {
	list := make([]string, len(figures))
	for i, f := range figures {
		list[i] = strings.ToLower(f.Title[:1]) + f.Title[1:]
	}
	return list
}

// paintSheet lays the pictures out: two above three, the caption at the foot.
func paintSheet(c draw.Canvas, plots []*plot.Plot, caption string) {
	margin, gap, foot := vg.Centimeter, 0.5*vg.Centimeter, 1.2*vg.Centimeter
	c.SetColor(plots[0].BackgroundColor)
	c.Fill(c.Rectangle.Path())
	inner := draw.Crop(c, margin, -margin, margin, -margin)
	style := draw.TextStyle{Color: ink, Font: sans(8.5), Handler: plot.DefaultTextHandler}
	for i, text := range strings.Split(caption, "\n") {
		inner.FillText(style, vg.Point{X: inner.Min.X, Y: inner.Min.Y + foot - vg.Length(i+1)*11}, text)
	}
	width, height := inner.Max.X-inner.Min.X, inner.Max.Y-inner.Min.Y-foot
	rows := [][]int{{0, 1}, {2, 3, 4}}
	for row, members := range rows {
		top := vg.Length(row) * height / 2
		each := (width - gap*vg.Length(len(members)-1)) / vg.Length(len(members))
		for column, k := range members {
			left := vg.Length(column) * (each + gap)
			cell := draw.Crop(inner, left, left+each-width, foot+height/2-top+gap/2, -top)
			plots[k].Draw(cell)
		}
	}
}

// A sheet is what is painted on one page.
type sheet struct {
	width, height      vg.Length
	paint              func(draw.Canvas)
	title, description string
}

// save writes name.svg and name.png.
func (s sheet) save(name string) ([]string, error) {
	var names []string
	for _, f := range []struct {
		ending string
		write  func(io.Writer) error
	}{{".svg", s.writeSVG}, {".png", s.writePNG}} {
		var b bytes.Buffer
		if err := f.write(&b); err != nil {
			return names, fmt.Errorf("draw: %s%s: %w", name, f.ending, err)
		}
		if err := os.WriteFile(name+f.ending, b.Bytes(), 0o644); err != nil {
			return names, fmt.Errorf("draw: %w", err)
		}
		names = append(names, name+f.ending)
	}
	return names, nil
}

func (s sheet) writePNG(w io.Writer) error {
	c := vgimg.NewWith(vgimg.UseWH(s.width, s.height), vgimg.UseDPI(dotsPerInch))
	s.paint(draw.New(c))
	_, err := vgimg.PngCanvas{Canvas: c}.WriteTo(w)
	return err
}

// writeSVG writes the page with its title and description, for those who have
// it read to them.
func (s sheet) writeSVG(w io.Writer) error {
	c := vgsvg.NewWith(vgsvg.UseWH(s.width, s.height), vgsvg.EmbedFonts(true))
	s.paint(draw.New(c))
	var b bytes.Buffer
	if _, err := c.WriteTo(&b); err != nil {
		return err
	}
	head, tail, found := strings.Cut(b.String(), "<svg ")
	attributes, body, closed := strings.Cut(tail, ">")
	if !found || !closed {
		return fmt.Errorf("no svg element in %d bytes", b.Len())
	}
	_, err := fmt.Fprintf(w, "%s<svg role=\"img\" aria-labelledby=\"title desc\" %s>\n<title id=\"title\">%s</title>\n<desc id=\"desc\">%s</desc>%s",
		head, attributes, html.EscapeString(s.title), html.EscapeString(s.description), body)
	return err
}

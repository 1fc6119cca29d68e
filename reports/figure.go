package reports

import (
	"bytes"
	"errors"
	"fmt"
	"image/color"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/plotter"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgsvg"

	"drivemend/diagnose/stress"
)

var errNoEdge = errors.New("there is no edge to draw; state what the margin lists under missing values")

// FigureSVG writes the predicted edge before and after as one SVG file that loads nothing. The error tells when there
// is no edge to draw.
func FigureSVG(w io.Writer, m *stress.Margin) error {
	if m == nil {
		return errNoEdge
	}
	svg, err := decidingFigure(m).svg(m)
	if err != nil {
		return err
	}
	_, err = io.WriteString(w, svg)
	return err
}

// drawnEdge is one edge of the figure; the dashes tell it apart without colour.
type drawnEdge struct {
	name   string
	edge   *stress.Edge
	color  color.NRGBA
	dashes []vg.Length
}

var (
	orange = color.NRGBA{0xb3, 0x46, 0x00, 0xff} // the two lines keep 4.5 to 1 on white and differ in lightness
	blue   = color.NRGBA{0x1b, 0x4f, 0x9c, 0xff}
	black  = color.NRGBA{0, 0, 0, 0xff}
	grey   = color.NRGBA{0xdd, 0xdd, 0xdd, 0xff}
)

// edgeFigure is one drawing: an edge before and after.
type edgeFigure struct {
	id    string // of its words in a page
	title string
	when  string // the conditions
	edges []drawnEdge
}

// decidingFigure draws the edge that is highest at the highest bus and worst current, of each board.
func decidingFigure(m *stress.Margin) edgeFigure {
	return edgeFigure{"edge", "Predicted edge with the highest peak", "at the highest bus and worst current",
		drawable(m, func(f *stress.Figures) *stress.Edge { return f.Highest })}
}

// drawnFigures are all figures of a margin: the edge that decides and, where the two switches of a leg see each other's
// edges, the opening and the closing.
func drawnFigures(m *stress.Margin) []edgeFigure {
	out := []edgeFigure{decidingFigure(m)}
	boards := boardsOf(nil, m)
	if place := placeOfEdge(turnOn, boards); place == "" || place == atDiode {
		return out
	}
	for _, name := range edgeNames(boards) {
		out = append(out, edgeFigure{"edge-" + name, "Predicted edge: " + edgeWords(name, ""), "at nominal bus and running current",
			drawable(m, func(f *stress.Figures) *stress.Edge { return edgeOfBoard(f, name) })})
	}
	return out
}

// drawable are the edges of the boards that can be drawn.
func drawable(m *stress.Margin, pick func(f *stress.Figures) *stress.Edge) []drawnEdge {
	var out []drawnEdge
	for _, x := range []struct {
		f     *stress.Figures
		drawn drawnEdge
	}{{m.AsFound, drawnEdge{"as found", nil, orange, []vg.Length{6, 3}}}, {m.Rebuild, drawnEdge{"rebuild", nil, blue, nil}}} {
		if x.f == nil {
			continue
		}
		if e := pick(x.f); e != nil && finite(e.Waveform) {
			x.drawn.edge = e
			out = append(out, x.drawn)
		}
	}
	return out
}

// words says what a figure shows.
func (g edgeFigure) words(m *stress.Margin) string {
	var parts []string
	for _, x := range g.edges {
		style := "solid line"
		if x.dashes != nil {
			style = "dashed line"
		}
		parts = append(parts, fmt.Sprintf("%s (%s), %s, peak %s", x.name, style, edgeAndShape(x.edge), volts(x.edge.Peak)))
	}
	return g.title + before(g.edges) + ". Voltage at the chip over time, " + g.when + ": " + strings.Join(parts, "; ") +
		". Level lines: the rating " + volts(m.Rated) + " (solid) and 80 % of it, " + volts(m.Allowed) + " (dotted)."
}

// edgeAndShape is an edge in full with its shape, where that says more than the edge does.
func edgeAndShape(e *stress.Edge) string {
	text := edgeWords(e.Name, e.Position)
	if e.Shape == cutShape || e.Shape == gateShape {
		text += ", " + e.Shape
	}
	return text
}

const (
	figureWidth  = 17 * vg.Centimeter
	figureHeight = 10 * vg.Centimeter
	legendHeight = 1.9 * vg.Centimeter // above the axes, where no edge crosses it
	mostPoints   = 1200                // of a drawn edge
)

// svg draws the edges against the rating.
func (g edgeFigure) svg(m *stress.Margin) (string, error) {
	if len(g.edges) == 0 || !(m.Rated > 0) || math.IsInf(m.Rated, 0) {
		return "", errNoEdge
	}
	p := plot.New()
	p.X.Label.Text, p.Y.Label.Text = "time, ns", "voltage at the chip, V"
	p.X.Min, p.X.Max, p.Y.Min, p.Y.Max = 0, 1e9*shownSpan(g.edges), 0, 1.08*m.Rated
	setFonts(p)
	grid := plotter.NewGrid()
	grid.Vertical.Color, grid.Horizontal.Color = grey, grey
	p.Add(grid)
	for _, x := range g.edges {
		line, err := plotter.NewLine(curve(x.edge.Waveform, p.X.Max))
		if err != nil {
			return "", fmt.Errorf("the edge %s cannot be drawn: %w", x.name, err)
		}
		line.Color, line.Dashes, line.Width = x.color, x.dashes, 1.5
		p.Y.Max = max(p.Y.Max, 1.05*x.edge.Peak)
		p.Add(line)
		p.Legend.Add(fmt.Sprintf("%s: %s, peak %s", x.name, edgeShort(x.edge.Name), volts(x.edge.Peak)), line)
	}
	addLevels(p, m)
	return render(p, g.id, g.title+before(g.edges), g.words(m)), nil
}

// before says which boards are drawn.
func before(edges []drawnEdge) string {
	switch len(edges) {
	case 0:
		return ""
	case 1:
		return ", " + edges[0].name
	}
	return ", before and after the rebuild"
}

// ringsDrawn are the turns of an edge's ring that are drawn after its peak.
const ringsDrawn = 8

// shownSpan is how long the edges are drawn, in seconds: past every peak and its ring, but no further than all of them
// go unless a peak lies there.
func shownSpan(edges []drawnEdge) float64 {
	span, peak, rung := math.Inf(1), 0.0, 0.0
	for _, x := range edges {
		span = math.Min(span, x.edge.Waveform[len(x.edge.Waveform)-1].T)
		peak = math.Max(peak, x.edge.PeakTime)
		after := 3 * x.edge.PeakTime
		if x.edge.Ring > 0 {
			after = ringsDrawn / x.edge.Ring
		}
		rung = math.Max(rung, x.edge.PeakTime+after)
	}
	return math.Max(math.Min(span, rung), 1.5*peak)
}

func setFonts(p *plot.Plot) {
	for _, f := range []*font.Font{&p.X.Label.TextStyle.Font, &p.Y.Label.TextStyle.Font, &p.X.Tick.Label.Font, &p.Y.Tick.Label.Font, &p.Legend.TextStyle.Font} {
		f.Variant, f.Size = "Sans", 10
	}
	p.X.Tick.Marker, p.Y.Tick.Marker = plot.TickerFunc(roundTicks), plot.TickerFunc(roundTicks)
	p.Legend.Top, p.Legend.Left = true, true
	p.Legend.ThumbnailWidth, p.Legend.Padding = 28, 2
}

const mostTicks = 8

// roundTicks marks an axis at steps of 1, 2 or 5 times a power of ten, each with its number.
func roundTicks(low, high float64) []plot.Tick {
	step := math.Pow(10, math.Floor(math.Log10((high-low)/mostTicks)))
	for _, times := range []float64{1, 2, 5, 10} {
		if (high-low)/(step*times) <= mostTicks {
			step *= times
			break
		}
	}
	var ticks []plot.Tick
	for k := math.Ceil(low / step); len(ticks) <= mostTicks; k++ {
		v := k * step
		if v > high {
			break
		}
		ticks = append(ticks, plot.Tick{Value: v, Label: strconv.FormatFloat(v+0, 'g', 6, 64)})
	}
	return ticks
}

// addLevels draws the rating and its 80 % across the whole width.
func addLevels(p *plot.Plot, m *stress.Margin) {
	for _, level := range []struct {
		name   string
		volt   float64
		dashes []vg.Length
		width  vg.Length
	}{{"rated", m.Rated, nil, 1.2}, {"80 % of rated", m.Allowed, []vg.Length{2, 2}, 1.2}} {
		line, err := plotter.NewLine(plotter.XYs{{X: p.X.Min, Y: level.volt}, {X: p.X.Max, Y: level.volt}})
		if err != nil {
			continue // a level that is no number is left out; the table beside says so
		}
		line.Color, line.Dashes, line.Width = black, level.dashes, level.width
		p.Add(line)
		p.Legend.Add(level.name+", "+volts(level.volt), line)
	}
}

// curve gives the samples up to a time, in ns and V; of more than fit the figure it keeps, of each stretch, the lowest
// and the highest, so that no peak is lost.
func curve(w []stress.Sample, until float64) plotter.XYs {
	var out plotter.XYs
	add := func(s stress.Sample) {
		if x := s.T * 1e9; x <= until {
			out = append(out, plotter.XY{X: x, Y: s.V})
		}
	}
	step := max(1, 2*len(w)/mostPoints)
	for from := 0; from < len(w); from += step {
		low, high := from, from
		for k := from; k < min(from+step, len(w)); k++ {
			if w[k].V < w[low].V {
				low = k
			}
			if w[k].V > w[high].V {
				high = k
			}
		}
		add(w[min(low, high)])
		if low != high {
			add(w[max(low, high)])
		}
	}
	return out
}

// finite tells whether a waveform can be drawn: two samples at least, and numbers only.
func finite(w []stress.Sample) bool {
	for _, s := range w {
		if math.IsNaN(s.T+s.V) || math.IsInf(s.T+s.V, 0) {
			return false
		}
	}
	return len(w) >= 2 && w[len(w)-1].T > 0
}

var fontFamily = regexp.MustCompile(`font-family:[^;]*;font-variant:[^;]*;font-weight:[^;]*;font-style:[^;"]*`)

// render turns a plot into an SVG for a page: no fonts named that a reader may not have, sized by the page, with
// title and description for readers who cannot see it.
func render(p *plot.Plot, id, title, description string) string {
	canvas := vgsvg.NewWith(vgsvg.UseWH(figureWidth, figureHeight))
	whole, legend := draw.New(canvas), p.Legend
	p.Legend = plot.NewLegend()
	p.Draw(draw.Crop(whole, 0, 0, 0, -legendHeight))
	legend.Draw(draw.Crop(whole, 46, 0, figureHeight-legendHeight, 0))
	var b bytes.Buffer
	if _, err := canvas.WriteTo(&b); err != nil {
		return "" // a buffer does not fail
	}
	_, body, _ := strings.Cut(b.String(), ">\n<g ")
	head := fmt.Sprintf(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %s %s" width="100%%" role="img" aria-labelledby="%s-title %s-text" style="font-family:sans-serif">`,
		points(figureWidth), points(figureHeight), id, id)
	words := fmt.Sprintf("<title id=\"%s-title\">%s</title>\n<desc id=\"%s-text\">%s</desc>\n", id, xmlText(title), id, xmlText(description))
	body = strings.ReplaceAll(fontFamily.ReplaceAllString(body, "font-family:sans-serif"), "\n\t", " ")
	return head + "\n" + words + "<g " + body
}

func points(l vg.Length) string { return strconv.FormatFloat(l.Points(), 'f', 1, 64) }

var xmlEscapes = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;", `"`, "&quot;")

func xmlText(text string) string { return xmlEscapes.Replace(plain(text)) }

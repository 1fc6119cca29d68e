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
	svg, err := edgeSVG(m)
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

// drawnEdges are the edges of a margin that can be drawn.
func drawnEdges(m *stress.Margin) []drawnEdge {
	var out []drawnEdge
	if m.AsFound != nil && m.AsFound.Highest != nil && finite(m.AsFound.Highest.Waveform) {
		out = append(out, drawnEdge{"as found", m.AsFound.Highest, orange, []vg.Length{6, 3}})
	}
	if m.Rebuild != nil && m.Rebuild.Highest != nil && finite(m.Rebuild.Highest.Waveform) {
		out = append(out, drawnEdge{"rebuild", m.Rebuild.Highest, blue, nil})
	}
	return out
}

// edgeDescription says in words what the figure shows.
func edgeDescription(m *stress.Margin) string {
	var parts []string
	for _, x := range drawnEdges(m) {
		style := "solid line"
		if x.dashes != nil {
			style = "dashed line"
		}
		parts = append(parts, fmt.Sprintf("%s (%s), peak %s", x.name, style, volts(x.edge.Peak)))
	}
	return "Voltage at the chip over time while the switch opens at the highest bus and worst current, gate-limited edge: " + strings.Join(parts, "; ") +
		". Level lines: the rating " + volts(m.Rated) + " (solid) and 80 % of it, " + volts(m.Allowed) + " (dotted)."
}

const (
	figureWidth  = 17 * vg.Centimeter
	figureHeight = 9 * vg.Centimeter
	mostPoints   = 1200 // of a drawn edge
)

// edgeSVG draws the gate-limited edges at highest bus and worst current against the rating.
func edgeSVG(m *stress.Margin) (string, error) {
	edges := drawnEdges(m)
	if len(edges) == 0 || !(m.Rated > 0) || math.IsInf(m.Rated, 0) {
		return "", errNoEdge
	}
	p := plot.New()
	p.X.Label.Text, p.Y.Label.Text = "time, ns", "voltage at the chip, V"
	p.X.Min, p.X.Max, p.Y.Min, p.Y.Max = 0, 1e9*shownSpan(edges), 0, 1.08*m.Rated
	setFonts(p)
	grid := plotter.NewGrid()
	grid.Vertical.Color, grid.Horizontal.Color = grey, grey
	p.Add(grid)
	for _, x := range edges {
		line, err := plotter.NewLine(curve(x.edge.Waveform, p.X.Max))
		if err != nil {
			return "", fmt.Errorf("the edge %s cannot be drawn: %w", x.name, err)
		}
		line.Color, line.Dashes, line.Width = x.color, x.dashes, 1.5
		p.Y.Max = max(p.Y.Max, 1.05*x.edge.Peak)
		p.Add(line)
		p.Legend.Add(fmt.Sprintf("%s, peak %s", x.name, volts(x.edge.Peak)), line)
	}
	addLevels(p, m)
	return render(p, edgeDescription(m)), nil
}

// shownSpan is how long the edges are drawn, in seconds: as far as all of them go, but past every peak.
func shownSpan(edges []drawnEdge) float64 {
	span, peak := math.Inf(1), 0.0
	for _, x := range edges {
		span = math.Min(span, x.edge.Waveform[len(x.edge.Waveform)-1].T)
		peak = math.Max(peak, x.edge.PeakTime)
	}
	return math.Max(span, 1.5*peak)
}

func setFonts(p *plot.Plot) {
	for _, f := range []*font.Font{&p.X.Label.TextStyle.Font, &p.Y.Label.TextStyle.Font, &p.X.Tick.Label.Font, &p.Y.Tick.Label.Font, &p.Legend.TextStyle.Font} {
		f.Variant, f.Size = "Sans", 10
	}
	p.X.Tick.Marker, p.Y.Tick.Marker = plot.TickerFunc(roundTicks), plot.TickerFunc(roundTicks)
	p.Legend.Top, p.Legend.Left = false, false
	p.Legend.YOffs, p.Legend.XOffs = 8, -4
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
func render(p *plot.Plot, description string) string {
	canvas := vgsvg.NewWith(vgsvg.UseWH(figureWidth, figureHeight))
	p.Draw(draw.New(canvas))
	var b bytes.Buffer
	if _, err := canvas.WriteTo(&b); err != nil {
		return "" // a buffer does not fail
	}
	_, body, _ := strings.Cut(b.String(), ">\n<g ")
	head := fmt.Sprintf(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %s %s" width="100%%" role="img" aria-labelledby="edge-title edge-text" style="font-family:sans-serif">`,
		points(figureWidth), points(figureHeight))
	words := "<title id=\"edge-title\">Predicted turn-off edge before and after the rebuild</title>\n<desc id=\"edge-text\">" + xmlText(description) + "</desc>\n"
	body = strings.ReplaceAll(fontFamily.ReplaceAllString(body, "font-family:sans-serif"), "\n\t", " ")
	return head + "\n" + words + "<g " + body
}

func points(l vg.Length) string { return strconv.FormatFloat(l.Points(), 'f', 1, 64) }

var xmlEscapes = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;", `"`, "&quot;")

func xmlText(text string) string { return xmlEscapes.Replace(plain(text)) }

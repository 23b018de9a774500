package chart

import (
	"fmt"
	"html"
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/recorder"

	"strayd/rules"
)

// SVG writes a chart as one element to be set into a page. It holds no script, no style and no outside reference, takes the page's colour and font,
// and says what it shows in words. The page's style may give each class a color: chart on the whole, chart-range, chart-watch, chart-edge, chart-zero,
// chart-return, chart-reference, chart-flag, chart-word. Id must be unique in the page, and safe in an attribute; it is "" without a point.
func SVG(c *rules.Chart, id string, s Size) string {
	if len(c.Points) == 0 {
		return ""
	}
	s = s.or()
	r := &recorder.Canvas{}
	lay(c, draw.NewCanvas(r, vg.Length(s.Width), vg.Length(s.Height)), "")
	w := &writer{height: vg.Length(s.Height)}
	fmt.Fprintf(w, `<svg class="chart" xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" role="img" aria-labelledby="%s-title %[3]s-text">`,
		s.Width, s.Height, id)
	fmt.Fprintf(w, `<title id="%s-title">%s</title><desc id="%[1]s-text">%[3]s</desc>`+"\n", id, html.EscapeString(Title(c)), html.EscapeString(Text(c)))
	for _, a := range r.Actions {
		w.action(a)
	}
	return w.String() + "</svg>\n"
}

// writer turns what was drawn into elements. The drawing library measures upwards from the foot, a page downwards from the top.
type writer struct {
	strings.Builder
	height vg.Length
	ink    ink
	width  vg.Length
	dashes []vg.Length
}

func (w *writer) action(a recorder.Action) {
	switch a := a.(type) {
	case *recorder.SetColor:
		w.ink, _ = a.Color.(ink)
	case *recorder.SetLineWidth:
		w.width = a.Width
	case *recorder.SetLineDash:
		w.dashes = a.Dashes
	case *recorder.Fill:
		if w.ink.class != paper.class {
			fmt.Fprintf(w, `<path class="%s" fill="%s" fill-opacity="%s" d="%s"/>`+"\n", w.ink.class, w.ink.paint, w.ink.faint, w.path(a.Path))
		}
	case *recorder.Stroke:
		w.stroke(a.Path)
	case *recorder.FillString:
		fmt.Fprintf(w, `<text class="%s" fill="%s" fill-opacity="%s" x="%s" y="%s" font-size="%s">%s</text>`+"\n", w.ink.class, w.ink.paint, w.ink.faint,
			short(a.Point.X), short(w.height-a.Point.Y), short(a.Size), html.EscapeString(a.String))
	}
}

func (w *writer) stroke(path vg.Path) {
	fmt.Fprintf(w, `<path class="%s" fill="none" stroke="%s" stroke-opacity="%s" stroke-width="%s" stroke-linejoin="round"`, w.ink.class, w.ink.paint,
		w.ink.faint, short(w.width))
	if len(w.dashes) > 0 {
		fmt.Fprintf(w, ` stroke-dasharray="%s %s"`, short(w.dashes[0]), short(w.dashes[1]))
	}
	fmt.Fprintf(w, ` d="%s"/>`+"\n", w.path(path))
}

func (w *writer) path(path vg.Path) string {
	var b strings.Builder
	for _, c := range path {
		x, y := short(c.Pos.X), short(w.height-c.Pos.Y)
		switch c.Type {
		case vg.MoveComp:
			fmt.Fprintf(&b, "M%s %s", x, y)
		case vg.LineComp:
			fmt.Fprintf(&b, "L%s %s", x, y)
		case vg.ArcComp: // only whole circles are drawn, in two halves
			r := short(c.Radius)
			fmt.Fprintf(&b, "M%s %sa%s %[3]s 0 1 0 %s 0a%[3]s %[3]s 0 1 0 -%[4]s 0", short(c.Pos.X-c.Radius), y, r, short(2*c.Radius))
		case vg.CloseComp:
			b.WriteByte('Z')
		}
	}
	return b.String()
}

// short writes a length to a tenth.
func short(v vg.Length) string {
	return strconv.FormatFloat(math.Round(float64(v)*10)/10, 'f', -1, 64)
}

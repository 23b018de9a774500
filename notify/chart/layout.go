package chart

import (
	"slices"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/font/liberation"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"strayd/notify"
	"strayd/rules"
)

// Size is how large a chart is, in points of a picture or CSS pixels of a page. 0 stands for 480 by 270.
type Size struct{ Width, Height int }

func (s Size) or() Size {
	if s.Width == 0 {
		s.Width = 480
	}
	if s.Height == 0 {
		s.Height = 270
	}
	return s
}

const (
	wordSize    = 12
	headingSize = 14
	edge        = 8 // around the whole
)

// plan is a chart on its way to a canvas.
type plan struct {
	*rules.Chart
	canvas  draw.Canvas
	fonts   text.Handler
	heading string
	box     vg.Rectangle // where returns are drawn
	low     float64
	high    float64
	from    rules.Date
	to      rules.Date
}

// lay draws a chart on a canvas. It needs at least one point.
func lay(c *rules.Chart, on draw.Canvas, heading string) {
	p := &plan{Chart: c, canvas: on, heading: heading, fonts: text.Plain{Fonts: font.NewCache(liberation.Collection())}}
	p.low, p.high = extent(c)
	p.from, p.to = c.Points[0].Date, c.Points[len(c.Points)-1].Date
	if p.from == p.to {
		p.from, p.to = p.from-1, p.to+1
	}
	p.frame()
	p.band(rangeInk, func(l rules.Lines) (low, high rules.Num) { return l.Low, l.High })
	p.band(watchInk, func(l rules.Lines) (low, high rules.Num) { return l.WatchLow, l.WatchHigh })
	p.axes()
	p.edges()
	p.reference()
	p.returns()
	p.mark()
	p.legend()
}

func (p *plan) style(i ink, size vg.Length, x draw.XAlignment, y draw.YAlignment) text.Style {
	f := font.From(font.Font{Typeface: "Liberation", Variant: "Sans"}, size)
	return text.Style{Color: i, Font: f, XAlign: x, YAlign: y, Handler: p.fonts}
}

func (p *plan) word(x, y vg.Length, s string, h draw.XAlignment, v draw.YAlignment) {
	p.canvas.FillText(p.style(wordInk, wordSize, h, v), vg.Point{X: x, Y: y}, s)
}

// frame fills the ground and leaves room for what is written around the box.
func (p *plan) frame() {
	c := &p.canvas
	c.SetColor(paper)
	c.Fill(c.Rectangle.Path())
	words := p.style(wordInk, wordSize, draw.XLeft, draw.YTop)
	widest := vg.Length(0)
	for _, t := range returnTicks(p.low, p.high) {
		widest = max(widest, words.Width(t.text))
	}
	p.box = vg.Rectangle{Min: vg.Point{X: c.Min.X + edge + widest + 6, Y: c.Min.Y + edge + 2.7*wordSize},
		Max: vg.Point{X: c.Max.X - edge - 6, Y: c.Max.Y - 2*edge}}
	if p.heading != "" {
		p.line(p.style(headingInk, headingSize, draw.XLeft, draw.YTop), c.Max.Y-edge, notify.Safe(p.heading, 100))
		p.box.Max.Y -= 1.5 * headingSize
	}
}

func (p *plan) x(d float64) vg.Length {
	return p.box.Min.X + (p.box.Max.X-p.box.Min.X)*vg.Length((d-float64(p.from))/float64(p.to-p.from))
}

// y is the place of a return, at the box's edge for one that lies beyond it.
func (p *plan) y(v float64) vg.Length {
	share := (min(max(v, p.low), p.high) - p.low) / (p.high - p.low)
	return p.box.Min.Y + (p.box.Max.Y-p.box.Min.Y)*vg.Length(share)
}

func (p *plan) at(d rules.Date, v float64) vg.Point { return vg.Point{X: p.x(float64(d)), Y: p.y(v)} }

func (p *plan) axes() {
	c := &p.canvas
	thin := draw.LineStyle{Color: zeroInk, Width: 0.6}
	for _, t := range returnTicks(p.low, p.high) {
		y := p.y(t.at)
		p.word(p.box.Min.X-6, y, t.text, draw.XRight, draw.YCenter)
		c.StrokeLine2(thin, p.box.Min.X-3, y, p.box.Min.X, y)
	}
	c.StrokeLine2(thin, p.box.Min.X, p.y(0), p.box.Max.X, p.y(0))
	words := p.style(wordInk, wordSize, draw.XCenter, draw.YTop)
	for _, t := range dateTicks(p.from, p.to) {
		x := p.x(t.at)
		c.StrokeLine2(thin, x, p.box.Min.Y-3, x, p.box.Min.Y)
		half := words.Width(t.text) / 2
		x = min(max(x, p.canvas.Min.X+edge+half), p.canvas.Max.X-edge-half)
		p.word(x, p.box.Min.Y-5, t.text, draw.XCenter, draw.YTop)
	}
}

// legend says in one line what is drawn how.
func (p *plan) legend() {
	s := "Line: returns"
	if p.Reference != "" {
		s += ", dashed: " + notify.Name(p.Reference)
	}
	s += ". Shaded: expected"
	if slices.ContainsFunc(p.Points, func(q rules.ChartPoint) bool { return q.WatchLow.OK || q.WatchHigh.OK }) {
		s += ", the inner part not even watched"
	}
	s += "."
	if p.Marked != rules.NoDate {
		s += " Ring: flagged."
	}
	p.line(p.style(wordInk, wordSize-1.5, draw.XLeft, draw.YBottom), p.canvas.Min.Y+edge-3, s)
}

// line writes a line over the whole width, in smaller type where it would not fit.
func (p *plan) line(style text.Style, y vg.Length, s string) {
	room := p.canvas.Max.X - p.canvas.Min.X - 2*edge
	if wide := style.Width(s); wide > room {
		style.Font.Size *= room / wide
	}
	p.canvas.FillText(style, vg.Point{X: p.canvas.Min.X + edge, Y: y}, s)
}

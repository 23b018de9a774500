package chart

import (
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"strayd/rules"
)

// band fills what lies between two lines, over each run of dates that have one at least. A side without a line goes to the edge.
func (p *plan) band(i ink, of func(rules.Lines) (low, high rules.Num)) {
	var low, high []vg.Point
	fill := func() {
		if len(low) > 0 {
			slices.Reverse(high)
			p.canvas.FillPolygon(i, append(low, high...))
		}
		low, high = nil, nil
	}
	for n, point := range p.Points {
		l, h := of(point.Lines)
		if !l.OK && !h.OK {
			fill()
			continue
		}
		from, to := p.low, p.high
		if l.OK {
			from = l.V
		}
		if h.OK {
			to = h.V
		}
		left, right := p.span(n)
		low = append(low, vg.Point{X: left, Y: p.y(from)}, vg.Point{X: right, Y: p.y(from)})
		high = append(high, vg.Point{X: left, Y: p.y(to)}, vg.Point{X: right, Y: p.y(to)})
	}
	fill()
}

// span is what a date covers of the picture's width: half the way to its neighbours.
func (p *plan) span(n int) (left, right vg.Length) {
	here := float64(p.Points[n].Date)
	left, right = p.box.Min.X, p.box.Max.X
	if n > 0 {
		left = p.x((float64(p.Points[n-1].Date) + here) / 2)
	}
	if n+1 < len(p.Points) {
		right = p.x((here + float64(p.Points[n+1].Date)) / 2)
	}
	return left, right
}

// edges draws the outer lines, so that the range is seen where shades are not.
func (p *plan) edges() {
	style := draw.LineStyle{Color: edgeInk, Width: 0.7}
	for _, of := range []func(rules.Lines) rules.Num{func(l rules.Lines) rules.Num { return l.Low }, func(l rules.Lines) rules.Num { return l.High }} {
		p.runs(style, func(n int) (points []vg.Point) {
			if v := of(p.Points[n].Lines); v.OK {
				left, right := p.span(n)
				points = []vg.Point{{X: left, Y: p.y(v.V)}, {X: right, Y: p.y(v.V)}}
			}
			return points
		})
	}
}

// runs strokes the points of each run of dates that has any.
func (p *plan) runs(style draw.LineStyle, of func(n int) []vg.Point) {
	var line []vg.Point
	for n := range p.Points {
		points := of(n)
		if len(points) == 0 {
			p.canvas.StrokeLines(style, line)
			line = nil
		}
		line = append(line, points...)
	}
	p.canvas.StrokeLines(style, line)
}

func (p *plan) reference() {
	style := draw.LineStyle{Color: otherInk, Width: 1, Dashes: []vg.Length{4, 3}}
	p.runs(style, func(n int) []vg.Point {
		if v := p.Points[n].Reference; v.OK && p.Reference != "" {
			return []vg.Point{p.at(p.Points[n].Date, v.V)}
		}
		return nil
	})
}

// returns draws the line of the returns, and a dot on each that was beyond its range.
func (p *plan) returns() {
	p.runs(draw.LineStyle{Color: returnInk, Width: 1.3}, func(n int) []vg.Point { return []vg.Point{p.at(p.Points[n].Date, p.Points[n].Return)} })
	for _, point := range p.Points {
		if point.Finding == rules.Breach && point.Date != p.Marked {
			p.dot(returnInk, p.at(point.Date, point.Return), 2.6)
		}
	}
}

func circle(at vg.Point, radius vg.Length) vg.Path {
	var path vg.Path
	path.Move(vg.Point{X: at.X + radius, Y: at.Y})
	path.Arc(at, radius, 0, 2*math.Pi)
	path.Close()
	return path
}

func (p *plan) dot(i ink, at vg.Point, radius vg.Length) {
	p.canvas.SetColor(i)
	p.canvas.Fill(circle(at, radius))
}

// mark rings the flagged value and writes it beside; one that is not to scale has an arrow towards where it lies.
func (p *plan) mark() {
	n := slices.IndexFunc(p.Points, func(q rules.ChartPoint) bool { return q.Date == p.Marked })
	if n < 0 {
		return
	}
	v := p.Points[n].Return
	at, words := p.at(p.Marked, v), rules.InPercent(v)
	if v < p.low || v > p.high {
		p.arrow(at, v > p.high)
		words += ", not to scale"
	} else {
		p.dot(flagInk, at, 2.6)
		p.canvas.SetLineStyle(draw.LineStyle{Color: flagInk, Width: 1.8})
		p.canvas.Stroke(circle(at, 6))
	}
	style := p.style(flagInk, wordSize+1, draw.XRight, draw.YCenter)
	x, width := at.X-11, style.Width(words)
	if x-width < p.box.Min.X {
		style.XAlign, x = draw.XLeft, at.X+11
	}
	y := min(max(at.Y, p.box.Min.Y+7), p.box.Max.Y-7)
	if p.Points[n].Finding != rules.Breach { // among the other returns: above them
		y = p.box.Max.Y + 5
		p.canvas.StrokeLine2(draw.LineStyle{Color: flagInk, Width: 0.8}, at.X, y-7, at.X, at.Y+7)
	}
	p.canvas.FillText(style, vg.Point{X: x, Y: y}, words)
}

// arrow points up or down, beyond the box.
func (p *plan) arrow(tip vg.Point, up bool) {
	tall := vg.Length(11)
	if up {
		tall = -tall
	}
	p.canvas.FillPolygon(flagInk, []vg.Point{tip, {X: tip.X - 5.5, Y: tip.Y + tall}, {X: tip.X + 5.5, Y: tip.Y + tall}})
}

package weekly

import (
	"fmt"
	"strconv"

	"strayd/rules"
)

// drawing is a small picture made of bars and lines, in units of its own. What it shows is said in Text too.
type drawing struct {
	Title, Text string
	Width       int
	Height      int
	Bars        []bar
	Rules       []stroke // level lines
	Labels      []label
}

type bar struct {
	X, Y, W, H string
	Class      string
	Tip        string
}

type stroke struct{ X1, X2, Y string }

type label struct {
	X, Y, Text string
	Anchor     string // start, middle, end
}

const (
	drawWidth, drawHeight = 300, 90
	drawTop, drawFoot     = 14, 74 // between them the bars stand
)

func at(v float64) string { return strconv.FormatFloat(v, 'f', 1, 64) }

// bars stands values side by side; most is the value of full height.
func (d *drawing) bars(values []float64, most float64, class func(n int) string, tip func(n int) string) {
	if most <= 0 {
		most = 1
	}
	step := float64(drawWidth) / float64(max(1, len(values)))
	gap := min(4, step*0.25)
	for n, v := range values {
		if v <= 0 {
			continue
		}
		h := float64(drawFoot-drawTop) * min(v, most) / most
		d.Bars = append(d.Bars, bar{at(float64(n)*step + gap/2), at(drawFoot - h), at(max(step-gap, 0.4)), at(h), class(n), tip(n)})
	}
	d.Rules = append(d.Rules, stroke{"0", strconv.Itoa(drawWidth), strconv.Itoa(drawFoot)})
}

func (d *drawing) write(x float64, y int, anchor, text string) {
	d.Labels = append(d.Labels, label{at(x), strconv.Itoa(y), text, anchor})
}

func drawings(l *rules.WeekLog) []drawing {
	out := breachDrawings(l)
	return append(out, ageDrawing(l), feedDrawing(l))
}

// breachDrawings show, for each range that judged anything, how many values of each date were beyond its breach line.
func breachDrawings(l *rules.WeekLog) (out []drawing) {
	for i := range l.Now.Covers {
		c := &l.Now.Covers[i]
		if c.Group != "" || c.Outer.Judged == 0 || len(out) == 2 {
			continue
		}
		d := drawing{Title: "Range " + foreign(c.Range).Text + ": beyond the breach line, by date", Width: drawWidth, Height: drawHeight}
		var values []float64
		most, sum := 1, 0
		for _, x := range c.Days {
			values = append(values, float64(x.Outer))
			most = max(most, x.Outer)
			sum += x.Outer
		}
		d.bars(values, float64(most), func(n int) string {
			if c.Days[n].Date >= l.Now.Span.Monday {
				return "now"
			}
			return "then"
		}, func(n int) string {
			return fmt.Sprintf("%s: %d of %d", c.Days[n].Date.Day(), c.Days[n].Outer, c.Days[n].Judged)
		})
		first, last := c.Days[0].Date, c.Days[len(c.Days)-1].Date
		d.write(0, drawHeight-3, "start", first.String())
		d.write(drawWidth, drawHeight-3, "end", last.String())
		d.write(0, drawTop-4, "start", fmt.Sprintf("most %d", most))
		d.Text = fmt.Sprintf("%s values beyond the line on %d dates from %s to %s, at most %d on one; the week's dates are the strong bars", rules.Thousands(sum),
			len(c.Days), first, last, most)
		out = append(out, d)
	}
	return out
}

func ageDrawing(l *rules.WeekLog) drawing {
	d := drawing{Title: "Open flags by age in business days", Width: drawWidth, Height: drawHeight}
	now, last := l.Now.Ageing.Bands, l.Last.Ageing.Bands
	var values []float64
	most := 1
	text := ""
	for n := range now {
		values = append(values, float64(last[n]), float64(now[n]))
		most = max(most, now[n], last[n])
		if n > 0 {
			text += "; "
		}
		text += fmt.Sprintf("%s: %d, last week %d", bandWords(n), now[n], last[n])
	}
	d.bars(values, float64(most), func(n int) string {
		if n%2 == 1 {
			return "now"
		}
		return "then"
	}, func(n int) string { return bandWords(n / 2) })
	step := float64(drawWidth) / float64(len(now))
	for n := range now {
		d.write((float64(n)+0.5)*step, drawHeight-3, "middle", bandWords(n))
		d.write((float64(n)+0.5)*step, drawTop-4, "middle", fmt.Sprintf("%d (%d)", now[n], last[n]))
	}
	d.Text = text + ". Strong: this week"
	return d
}

// feedDrawing shows the share of due dates on time, of all feeds, over the weeks of the trend.
func feedDrawing(l *rules.WeekLog) drawing {
	d := drawing{Title: fmt.Sprintf("Feed dates on time, last %d weeks", rules.TrendWeeks), Width: drawWidth, Height: drawHeight}
	weeks := make([]rules.Portion, rules.TrendWeeks)
	for _, f := range l.Now.Feeds {
		for n, w := range f.Weeks {
			weeks[n].Add(w.OnTime)
		}
	}
	var values []float64
	for _, w := range weeks {
		v := 0.0
		if w.Whole > 0 {
			v = float64(w.Part) / float64(w.Whole)
		}
		values = append(values, v)
	}
	d.bars(values, 1, func(n int) string {
		if n == rules.TrendWeeks-1 {
			return "now"
		}
		return "then"
	}, func(n int) string { return fmt.Sprintf("%d of %d", weeks[n].Part, weeks[n].Whole) })
	step := float64(drawWidth) / rules.TrendWeeks
	d.Text = "Oldest first: "
	for n, w := range weeks {
		words := "none due"
		if w.Whole > 0 {
			words = fmt.Sprintf("%d/%d", w.Part, w.Whole)
			d.write((float64(n)+0.5)*step, drawTop-4, "middle", words)
		}
		if n > 0 {
			d.Text += ", "
		}
		d.Text += words
	}
	d.write(0, drawHeight-3, "start", rules.WeekName(l.Now.Span.Monday-7*(rules.TrendWeeks-1)))
	d.write(drawWidth, drawHeight-3, "end", rules.WeekName(l.Now.Span.Monday))
	return d
}

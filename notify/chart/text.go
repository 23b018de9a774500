package chart

import (
	"fmt"
	"slices"

	"strayd/notify"
	"strayd/rules"
)

// Title says in a few words what a chart shows.
func Title(c *rules.Chart) string {
	return notify.Name(c.Series) + " with its range " + notify.Name(c.Range)
}

// Text says in sentences what a chart shows, for who does not see it.
func Text(c *rules.Chart) string {
	if len(c.Points) == 0 {
		return "No return to show."
	}
	first, last := c.Points[0].Date, c.Points[len(c.Points)-1].Date
	s := fmt.Sprintf("%s of %s, %s to %s.", rules.Counted(len(c.Points), "return"), notify.Name(c.Series), first.Day(), last.Day())
	marked := slices.IndexFunc(c.Points, func(p rules.ChartPoint) bool { return p.Date == c.Marked })
	if marked >= 0 {
		s += " " + markedText(&c.Points[marked])
	}
	beyond := 0
	for n, p := range c.Points {
		if p.Finding == rules.Breach && n != marked {
			beyond++
		}
	}
	if beyond == 0 {
		return s + " No other return shown was beyond its range."
	}
	return s + fmt.Sprintf(" %s shown, too, beyond the range of the day.", rules.Counted(beyond, "other return"))
}

func markedText(p *rules.ChartPoint) string {
	s := fmt.Sprintf("Flagged: %s on %s", rules.InPercent(p.Return), p.Date.Day())
	if lines := rules.Between(p.Low, p.High); lines != "" {
		s += ", expected " + lines
	}
	if p.Reference.OK {
		s += ", reference " + rules.InPercent(p.Reference.V)
	}
	return s + "."
}

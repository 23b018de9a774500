package watcher

import (
	"fmt"
	"slices"

	"strayd/rules"
)

// ChartOf is what a chart is to show.
type ChartOf struct {
	Series string
	Range  string     // "" for the first range that is no limit, else the first
	Marked rules.Date // the date that a flag is about, NoDate for none
	To     rules.Date // the last date shown, NoDate for the newest
	Points int        // at most so many dates; 0 for 60
	AsOf   uint32     // the step whose knowledge is shown; 0 for the newest
}

// ChartFor is what a chart shows of a flag: its series, and the dates up to it, as they were known when it was raised.
func ChartFor(f *rules.Flag) ChartOf {
	return ChartOf{Series: f.Series, Range: f.Range, Marked: f.Date, To: f.Date, AsOf: f.Step}
}

const chartPoints = 60

// Chart gathers the figures of a chart. Each date has the verdict and the lines of its newest version then, as History gives them. Beside the return
// stands, under a residual range, what the reference foresaw of it; else the return of the reference, where that is a series.
func (r *Reader) Chart(of ChartOf) (*rules.Chart, error) {
	s, err := r.series(of.Series)
	if err != nil {
		return nil, err
	}
	if of.AsOf == 0 {
		of.AsOf = ^uint32(0)
	}
	c := &rules.Chart{Series: of.Series, Marked: of.Marked, Range: of.Range}
	from, to := s.lastDates(of.To, of.Points)
	for n := from; n < to; n++ {
		if _, known := s.latest(n, of.AsOf); !known {
			continue
		}
		rows, err := r.rows(s, n, of.AsOf, false)
		if err != nil {
			return nil, err
		}
		if p, ok := pointOf(rows, c); ok {
			c.Points = append(c.Points, p)
		}
	}
	if len(c.Points) == 0 {
		return nil, fmt.Errorf("series %q has no judged return to draw", of.Series)
	}
	return c, r.beside(s, c, of.AsOf)
}

// lastDates are the places of the last dates up to one.
func (s *seriesPast) lastDates(last rules.Date, points int) (from, to int) {
	if points == 0 {
		points = chartPoints
	}
	for to < len(s.dates) && (last == rules.NoDate || s.versions[s.dates[to]].Date <= last) {
		to++
	}
	return max(0, to-points), to
}

// pointOf is a date under the chart's range; a chart without one gets the first that fits. A date that the range did not judge is
// drawn without lines.
func pointOf(rows []Row, c *rules.Chart) (p rules.ChartPoint, ok bool) {
	if len(rows) == 0 {
		return p, false
	}
	if c.Range == "" {
		c.Range = rows[max(0, slices.IndexFunc(rows, func(r Row) bool { return !r.Limited }))].Range
	}
	p = rules.ChartPoint{Date: rows[0].Date, Return: rows[0].Return.Float(), Finding: rules.NotJudged}
	for _, row := range rows {
		if row.Range != c.Range {
			continue
		}
		p.Finding, p.Lines = row.Finding, row.Lines
		if row.Residual.OK {
			p.Reference, c.Reference = rules.Some(p.Return-row.Residual.V), foreseen
		}
	}
	return p, true
}

// foreseen is what a chart calls the return less its residual.
const foreseen = "foreseen"

// beside adds the returns of the reference, where that is a series and the chart does not say what it foresaw.
func (r *Reader) beside(s *seriesPast, c *rules.Chart, asOf uint32) error {
	set, err := r.settingsOf(s.versions[len(s.versions)-1].Step)
	if err != nil || c.Reference != "" {
		return err
	}
	name := set.members.Reference(s.name, s.group)
	id, ok := r.Names.Find([]byte(name))
	if !ok || name == "" {
		return nil
	}
	values, err := r.View.Series(Returns, id)
	if err != nil {
		return err
	}
	c.Reference = name
	for n := range c.Points {
		if v := valueOn(values, c.Points[n].Date, asOf); v != Missing64 {
			c.Points[n].Reference = rules.Some(rules.Units(v).Float())
		}
	}
	return nil
}

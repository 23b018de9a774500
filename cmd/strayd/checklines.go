package main

import (
	"fmt"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

// sayLines says each line of each range in every form, with the flags to expect of chance alone for the series that it judges.
func (a *app) sayLines(c *config.Config, names *watcher.Names) error {
	s, _, err := settings(c)
	if err != nil {
		return err
	}
	watcher.ResolveBudgets(&s, max(names.Len(), 1))
	judged, err := judgedBy(&s, names)
	if err != nil {
		return err
	}
	flags := 0.0
	for i, r := range s.Ranges {
		fmt.Fprintf(a.out, "\nrange %s: ", r.Name)
		if r.Limit != nil {
			fmt.Fprintf(a.out, "limit %s\n", between(rules.Some(r.Limit.Low.Float()), rules.Some(r.Limit.High.Float())))
			continue
		}
		perWeek, err := a.sayRange(r, judged[i], names.Len() > 0)
		if err != nil {
			return err
		}
		flags += perWeek
	}
	if names.Len() > 0 {
		fmt.Fprintf(a.out, "\nBreaches to expect of chance alone, all ranges together: about %.3g a week.", flags)
	}
	fmt.Fprintf(a.out, "\nExpected counts hold if returns follow the tail chosen; series move together, so that flags cluster.\n")
	return nil
}

// judgedBy counts for each range of the settings the series that it judges.
func judgedBy(s *rules.Settings, names *watcher.Names) ([]int, error) {
	m, err := rules.NewMembership(s)
	if err != nil {
		return nil, err
	}
	judged := make([]int, len(s.Ranges))
	for id := range uint32(names.Len()) {
		name := string(names.Name(id))
		group := m.Group(name)
		for i := range s.Ranges {
			if m.Applies(i, name, group) {
				judged[i]++
			}
		}
	}
	return judged, nil
}

// sayRange says the two lines of a range, and gives the breaches to expect in a week of five days.
func (a *app) sayRange(r rules.Range, series int, known bool) (perWeek float64, err error) {
	g, err := rules.NewGauge(r)
	if err != nil {
		return 0, err
	}
	fmt.Fprintf(a.out, "window %d, scale %s, tail %s\n", r.Window, r.Scale, tailWords(r.Tail))
	w := columns(a.out)
	for _, l := range []struct {
		name string
		line rules.Line
	}{{"watch", r.Watch}, {"breach", r.Breach}} {
		f, ok := g.Forms(l.line)
		if !ok || l.line.Budget > 0 && !known {
			fields(w, "  "+l.name, "a budget, turned into a level once there are series")
			continue
		}
		expect := ""
		if perWeek = 5 * f.Tail * float64(series); known {
			expect = fmt.Sprintf("about %.3g a week for %d series", perWeek, series)
		}
		z := "-"
		if f.Z > 0 {
			z = fmt.Sprintf("%.4g", f.Z)
		}
		fields(w, "  "+l.name, fmt.Sprintf("tail %.4g %%", 100*f.Tail), fmt.Sprintf("confidence %.6g %%", 100*f.Confidence), "z "+z,
			fmt.Sprintf("once in %.4g days", f.Days), expect)
	}
	return perWeek, w.Flush()
}

func tailWords(t rules.TailModel) string {
	switch {
	case t.Name == "t":
		return fmt.Sprintf("t with %g degrees of freedom", t.DF)
	case t.Name == "auto":
		return "auto (t with 5 degrees of freedom until a group has shown others)"
	}
	return t.Name
}

package main

import (
	"fmt"
	"slices"

	"strayd/config"
	"strayd/notify"
	"strayd/notify/chart"
	"strayd/rules"
	"strayd/watcher"
)

// viewer is a store that can be looked into while it is written.
type viewer interface {
	View() (watcher.View, error)
}

// pictures gives what draws the chart that goes with a notice about a value out of line; nil for a notice that has none. A channel
// of short form is told ref and series only.
func pictures(c *config.Config, l viewer) func(rules.Notice) (*notify.Picture, error) {
	return func(n rules.Notice) (*notify.Picture, error) {
		short := slices.ContainsFunc(c.Channels, func(ch rules.Channel) bool { return ch.Name == n.Channel && ch.Short })
		if short || len(n.Refs) == 0 || !slices.Contains(rules.OutOfLine, n.Kind) {
			return nil, nil
		}
		v, err := l.View()
		if err != nil {
			return nil, err
		}
		defer v.Close() //nolint:errcheck // only read
		return drawFlag(v, n.Refs[0])
	}
}

func drawFlag(v watcher.View, ref uint64) (*notify.Picture, error) {
	f, ok, err := v.Flag(ref)
	if err != nil || !ok || f.Series == "" {
		return nil, err
	}
	r, err := watcher.NewReader(v)
	if err != nil {
		return nil, err
	}
	c, err := r.Chart(watcher.ChartFor(&f))
	if err != nil {
		return nil, err
	}
	png, err := chart.PNG(c, fmt.Sprintf("%s, ref %d", notify.Name(f.Series), ref), chart.Size{})
	return &notify.Picture{Name: fmt.Sprintf("strayd-%d.png", ref), PNG: png, Text: chart.Text(c)}, err
}

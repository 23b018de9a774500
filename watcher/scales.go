package watcher

import "strayd/rules"

// groupScales are the deviations that groups lend to their provisional series in one step.
type groupScales struct{}

func (g *groupScales) at(rangeID uint16, group string, date rules.Date) rules.Num { return rules.Num{} }

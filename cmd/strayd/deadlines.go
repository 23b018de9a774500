package main

import (
	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// mostDue is how many of the dates that fell due since the last pass are judged: the newest ones.
const mostDue = 20

// deadlines judges the dates that fell due since the pass before, as the daemon does at each deadline; it begins with the first pass.
func (a *app) deadlines(c *config.Config, l *ledger.Ledger, p *watcher.Pass) error {
	for _, f := range c.Feeds {
		if f.Due == nil || p.Only != "" && p.Only != f.Name {
			continue
		}
		since, err := l.LastSlot(judged + f.Name)
		if err != nil {
			return err
		}
		var dates []rules.Date
		zone := location(c, f.Due.Timezone)
		if !since.IsZero() {
			dates = rules.DueBetween(*f.Due, since, p.Now, zone)
		}
		for _, date := range dates[max(0, len(dates)-mostDue):] {
			if err := p.Deadline(f, date, rules.DueAt(*f.Due, date, zone)); err != nil {
				return err
			}
		}
		if p.Now.After(since) {
			if err := l.Done(judged+f.Name, p.Now); err != nil {
				return err
			}
		}
	}
	return nil
}

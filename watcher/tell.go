package watcher

import "strayd/rules"

// tell puts the notices of a batch's flags into it: of those that are new or open again and ask something of a person.
// Those of slow-burn checks belong to the weekly log.
func (p *Pass) tell(b *Batch, series int) {
	if p.Tell == nil {
		return
	}
	news := rules.News{At: p.Now, Feed: b.File.File.Feed, File: b.File.File.Name, Rows: b.File.Counts.Rows, Series: series}
	for _, f := range b.Flags {
		switch {
		case !f.Standing.Asks() || f.Kind.Slow():
		case f.Reopens:
			news.Reopened = append(news.Reopened, f.Flag)
		case f.Step == b.Step:
			news.Flags = append(news.Flags, rules.FlagNews{Flag: f.Flag, Window: f.Window, WindowTo: f.WindowTo, Used: f.Used, Market: f.Market,
				Gated: b.File.Gated()})
		}
	}
	cover(news.Flags)
	if len(news.Flags)+len(news.Reopened) > 0 {
		b.Notices = p.Tell(news)
	}
}

// newestSeries counts the series that have a value on the newest date of a sheet.
func newestSeries(s *Sheet) (n int) {
	for i := len(s.Columns) - 1; i >= 0 && s.Columns[i].Date == s.Last(); i-- {
		n += s.Columns[i].rank(s.Columns[i].Len())
	}
	return n
}

// cover marks the breaches that a market day of the same news explains.
func cover(flags []rules.FlagNews) {
	market := map[groupDay]bool{}
	for n := range flags {
		if f := &flags[n]; f.Kind == rules.KindMarketDay {
			market[groupDay{f.Group, f.Date}] = true
		}
	}
	for n := range flags {
		f := &flags[n]
		f.Covered = f.Kind == rules.KindBreach && f.LooksLike == rules.CauseMarket && market[groupDay{f.Group, f.Date}]
	}
}

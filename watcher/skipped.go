package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// mostSkipped is how many dates that were passed over are flagged: the newest ones.
const mostSkipped = 5

// skipped flags the business days between the feed's newest date and the file's first newer one, of which no file of a daily feed brought
// anything.
func (g *fileGate) skipped(before []delivered, came []uint8) error {
	last := g.p.lastTaken(g.feed.Name)
	next := g.sheet.Last()
	for _, c := range g.sheet.Columns {
		if c.Date > last {
			next = min(next, c.Date)
		}
	}
	days := g.p.Settings.CalendarFor("")
	count := days.Between(last, next-1)
	if count <= 0 || !daily(before, days) {
		return nil
	}
	for n := max(1, count-mostSkipped+1); n <= count; n++ {
		date := days.Add(last, n)
		told, err := g.told(date)
		if err != nil {
			return err
		}
		absent, err := g.absent(date, came, len(before))
		if err != nil {
			return err
		}
		if !told && absent.Count > 0 {
			f := g.missing(date, rules.SkippedNote(absent))
			f.File = ""
			g.flags = append(g.flags, f)
		}
	}
	return nil
}

// daily says whether most of a feed's dates follow one on another.
func daily(before []delivered, days *rules.Calendar) bool {
	list := slices.SortedFunc(slices.Values(before), func(a, b delivered) int { return cmp.Compare(a.date, b.date) })
	next := 0
	for i := 1; i < len(list); i++ {
		if days.Between(list[i-1].date, list[i].date) <= 1 {
			next++
		}
	}
	return rules.Regular(next, len(list)-1)
}

// told says whether the feed has a flag on the date already, such as one that it is late or that its file was refused.
func (g *fileGate) told(date rules.Date) (found bool, err error) {
	takes := func(h FlagHead) bool { return h.Date == date && h.SeriesID == NoSeries }
	err = g.v.FlagsOf(true, takes, func(f rules.Flag) bool {
		found = f.Feed == g.feed.Name
		return !found
	})
	return found, err
}

// absent are the expected series that have no value on a date; none when one of them has.
func (g *fileGate) absent(date rules.Date, came []uint8, files int) (*rules.Naming, error) {
	names := &rules.Naming{}
	for _, bl := range allBlocks(g.j.heldNames, rules.NoDate) {
		held := make([]int64, bl.series)
		if ok, err := g.v.Fill(Returns, date, bl.number, 0, held); err != nil {
			return nil, err
		} else if !ok {
			fillMissing(held)
		}
		for i, v := range held {
			id := bl.number*BlockSize + uint32(i)
			if !rules.Regular(int(came[id]), files) || !g.p.Settings.Expects(g.name(id), date) {
				continue
			}
			if v != Missing64 {
				return &rules.Naming{}, nil
			}
			names.Add(g.name(id))
		}
	}
	return names, nil
}

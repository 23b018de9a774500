package watcher

import "strayd/rules"

// pair remembers how many business days lie between two dates under a calendar: most series of a date have the same.
type pair struct {
	from, to rules.Date
	calendar *rules.Calendar
	days     int
}

// termsOf notes the terms of a return that a price makes, where they are not the ordinary ones. own says that the file has that price, not
// only the one before it.
func (b *priceBlock) termsOf(date rules.Date, i int, own bool) {
	var t rules.Terms
	series := b.number*BlockSize + uint32(i)
	if own && len(b.sheet.Terms) > 0 {
		t = (&day{terms: termsIn(b.sheet.Terms, date, b.number)}).termsOf(series)
	}
	if !own || !b.sheet.Days {
		t.Days = b.between(i, b.on[i], date)
	}
	if t.Code() != 0 {
		b.terms = append(b.terms, CellTerms{date, series, t})
	}
}

// between counts the business days of a series from one date to another.
func (b *priceBlock) between(i int, from, to rules.Date) int {
	if to-from == 1 {
		return 1
	}
	var c *rules.Calendar
	if b.j.days != nil {
		c = b.calendar(i)
	}
	if p := &b.pair; p.from != from || p.to != to || p.calendar != c {
		*p = pair{from, to, c, c.Between(from, to)}
	}
	return b.pair.days
}

// calendar is that of a series; they are looked up once a block.
func (b *priceBlock) calendar(i int) *rules.Calendar {
	if b.days == nil {
		b.days = make([]*rules.Calendar, min(BlockSize, b.j.names.Len()-int(b.number)*BlockSize))
		for k := range b.days {
			b.days[k] = b.j.days(string(b.j.names.Name(b.number*BlockSize + uint32(k))))
		}
	}
	return b.days[i]
}

package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// termsKey names what the ledger keeps of the terms of values, as a range of its own: rules.Terms.Code for every value with one other
// than 0. It is there once a feed may have such values.
const termsKey = "terms"

// CellTerms are the terms of one value of a file.
type CellTerms struct {
	Date   rules.Date
	Series uint32
	rules.Terms
}

// SortTerms brings terms into the order of a sheet, by date, then series. Of several about one value the last in the order of their codes
// stays: rows that repeat a value may differ in them.
func SortTerms(list []CellTerms) []CellTerms {
	slices.SortFunc(list, func(a, b CellTerms) int {
		return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Series, b.Series), cmp.Compare(b.Code(), a.Code()))
	})
	return slices.CompactFunc(list, func(a, b CellTerms) bool { return a.Date == b.Date && a.Series == b.Series })
}

// termsIn are the terms of the values of one date and block.
func termsIn(list []CellTerms, date rules.Date, block uint32) []CellTerms {
	at := func(date rules.Date, series uint64) int {
		n, _ := slices.BinarySearchFunc(list, date, func(c CellTerms, date rules.Date) int {
			return cmp.Or(cmp.Compare(c.Date, date), cmp.Compare(uint64(c.Series), series))
		})
		return n
	}
	if len(list) == 0 {
		return nil
	}
	first := uint64(block) * BlockSize
	return list[at(date, first):at(date, first+BlockSize)]
}

// termed says that the pass has feeds whose values may have terms.
func (p *Pass) termed() bool {
	return slices.ContainsFunc(p.Feeds, func(f rules.Feed) bool {
		return f.Value == rules.OfPrice || f.Columns.Days != "" || f.Columns.Status != ""
	})
}

// termsHeld reads the codes of a date, 0 where none is held.
func termsHeld(v View, id uint16, date rules.Date, block uint32, from int, dst []int64) error {
	clear(dst)
	if id == 0 {
		return nil
	}
	return v.Patch(id, date, block, from, dst)
}

// termsHits makes hits of the values of a date that cover several business days: no window takes them.
func (w *worker) termsHits(t task, d *day, old bool, fresh []int64) error {
	if w.j.terms == 0 {
		return nil
	}
	if old {
		w.terms = slices.Grow(w.terms[:0], t.width)[:t.width]
		if err := termsHeld(w.view, w.j.terms, d.date, t.block, t.from, w.terms); err != nil {
			return err
		}
		for i, code := range w.terms {
			if days := rules.TermsOf(code); !days.Daily() && fresh[i] == Missing64 && w.raw[i] != Missing64 {
				w.hitAt(int32(i), false).days = days.Days
			}
		}
	}
	for _, c := range d.terms {
		if i := int(c.Series) - int(t.series(0)); i >= 0 && i < t.width && !c.Daily() && fresh[i] != Missing64 {
			w.hitAt(int32(i), true).days = c.Days
		}
	}
	return nil
}

// termsNote says what changed in the terms of a restated value, "" for nothing.
func (w *worker) termsNote(t task, d *day, i int) string {
	if w.j.terms == 0 {
		return ""
	}
	return d.termsOf(t.series(i)).After(rules.TermsOf(w.terms[i]))
}

// termsOf is what a file says of a value that it changes.
func (d *day) termsOf(series uint32) rules.Terms {
	n, ok := slices.BinarySearchFunc(d.terms, series, func(c CellTerms, s uint32) int { return cmp.Compare(c.Series, s) })
	if !ok {
		return rules.Terms{}
	}
	return d.terms[n].Terms
}

// withoutSpans leaves out of a row of values those that cover several business days, as the ledger has them.
func (j *judging) withoutSpans(v View, date rules.Date, block uint32, from int, row []int64) error {
	if j.terms == 0 {
		return nil
	}
	codes := make([]int64, len(row))
	if err := termsHeld(v, j.terms, date, block, from, codes); err != nil {
		return err
	}
	for i, code := range codes {
		if !rules.TermsOf(code).Daily() {
			row[i] = Missing64
		}
	}
	return nil
}

// onlyDaily leaves out of the values of a date and block those that cover several business days: the others of the date say nothing of them.
func (l *leader) onlyDaily(date rules.Date, number uint32, held bool) error {
	if l.j.terms == 0 {
		return nil
	}
	leave := func(m int) { l.values[m], l.fresh[m] = rules.Missing, false }
	if held {
		if err := termsHeld(l.view, l.j.terms, date, number, 0, l.raw); err != nil {
			return err
		}
		from, to := l.crew.in(task{block: number, width: BlockSize})
		for m := from; m < to; m++ {
			if !l.fresh[m] && !rules.TermsOf(l.raw[l.crew.series[m]%BlockSize]).Daily() {
				leave(m)
			}
		}
	}
	for _, c := range l.termsNow(number, date) {
		if m, ok := l.crew.at[c.Series]; ok && !c.Daily() && l.fresh[m] {
			leave(int(m))
		}
	}
	return nil
}

// termsNow are the terms of what the file changes of a block on a date.
func (l *leader) termsNow(number uint32, date rules.Date) []CellTerms {
	for _, d := range l.blocks[number] {
		if d.date == date {
			return d.terms
		}
	}
	return nil
}

// terms are those of a date of one series as of a step.
func (r *Reader) terms(s *seriesPast, set *recorded, date rules.Date, asOf uint32) (rules.Terms, error) {
	if set.terms == 0 {
		return rules.Terms{}, nil
	}
	kept, err := r.usedOf(s, set.terms)
	if err != nil {
		return rules.Terms{}, err
	}
	code := valueOn(kept, date, asOf)
	return rules.TermsOf(max(code, 0)), nil
}

package watcher

import (
	"cmp"
	"fmt"
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// tidy puts the views of a date in order, one a member: of two, that which was given first. What belongs to another date is doubtful.
func tidy(r *causes.Result) {
	slices.SortStableFunc(r.Views, func(a, b causes.View) int { return cmp.Compare(a.Member, b.Member) })
	r.Views = slices.CompactFunc(r.Views, func(a, b causes.View) bool { return a.Member == b.Member })
	for n := range r.Views {
		if v := &r.Views[n]; v.LooksLike == rules.CauseShifted && v.Kind == "" && slices.Contains(r.Shifted, v.Member) {
			v.Kind = rules.KindDoubtful
		}
	}
}

// leastShifted is how many series of a file must belong to another date before it is refused.
const leastShifted = 3

// offDate refuses a file whose values belong to another date, but for series in their first load. One that a person released is not
// refused, and its values are not doubtful for that; nor is one whose reference is out of line itself.
func (l *leader) offDate(date rules.Date, r *causes.Result) error {
	var fresh []int
	for _, m := range r.Shifted {
		if l.fresh[m] && !l.woken[m] && int(l.crew.series[m]) < l.j.firstNames {
			fresh = append(fresh, m)
		}
	}
	if len(fresh) < leastShifted {
		return nil
	}
	odd := slices.ContainsFunc(fresh, func(m int) bool { return l.j.odd[l.crew.series[l.crew.members[m].Reference.Series]] })
	if l.released || odd {
		for n := range r.Views {
			if v := &r.Views[n]; slices.Contains(r.Shifted, v.Member) {
				v.Kind, v.Out, v.Use = "", false, causes.AsIs
			}
		}
		return nil
	}
	held := l.crew.members[l.crew.members[fresh[0]].Reference.Series].ID
	return &BadFile{File: l.j.file, Date: date, Gate: true, LooksLike: rules.CauseShifted,
		Reason: fmt.Sprintf("the values of %s for %s fit what %s returned on another date", rules.Counted(len(fresh), "series"), date, held),
		Ask:    "ask the provider which valuation date the values are of"}
}

package watcher

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"strayd/rules"
	"strayd/rules/causes"
)

// mostNamed is how many series the note of a market day names.
const mostNamed = 10

// marketFlags raises one flag a group and date of which a file changes a value and whose members moved together.
func (j *judging) marketFlags(v View) (flags []*FlagRow, err error) {
	var before map[groupDay]rules.Flag // raised for the date before
	for _, date := range j.weighed.dates() {
		d := j.weighed.days[date]
		for n := range d.Markets {
			m := &d.Markets[n]
			if !d.touches(j.weighed.crew, m.Group) {
				continue
			}
			if before == nil {
				if before, err = marketDays(v); err != nil {
					return nil, err
				}
			}
			f := j.marketFlag(date, m)
			if old, ok := before[groupDay{f.Group, date}]; ok {
				f.Ref, f.Step, f.RaisedAt, f.Standing, f.New = old.Ref, old.Step, old.RaisedAt, old.Standing, false
			}
			flags = append(flags, f)
		}
	}
	return flags, nil
}

type groupDay struct {
	group string
	date  rules.Date
}

// marketDays lists the flags of market days that were raised.
func marketDays(v View) (map[groupDay]rules.Flag, error) {
	out := map[groupDay]rules.Flag{}
	takes := func(h FlagHead) bool { return h.Kind == rules.KindMarketDay }
	return out, v.FlagsOf(true, takes, func(f rules.Flag) bool {
		out[groupDay{f.Group, f.Date}] = f
		return true
	})
}

// touches says that the file changes a value of the group on the date.
func (d *weighedDay) touches(c *crew, group int) bool {
	for m, fresh := range d.fresh {
		if fresh && c.members[m].Group == group {
			return true
		}
	}
	return false
}

// marketFlag is the flag of one market day.
func (j *judging) marketFlag(date rules.Date, m *causes.Market) *FlagRow {
	c := j.weighed.crew
	f := &FlagRow{SeriesID: NoSeries, New: true, First: true}
	f.RaisedAt, f.Date, f.Group, f.Kind, f.Standing = j.now, date, c.groups[m.Group], rules.KindMarketDay, rules.Open
	f.Return = rules.Units(math.Round(m.Median * float64(rules.One)))
	f.Z = rules.Some(math.Copysign(m.MedianZ, m.Median))
	f.Feed, f.File = j.file.Feed, j.file.Name
	news := &rules.MarketNews{Reporting: m.Reporting, MedianZ: m.MedianZ}
	for _, at := range m.NotMoved {
		news.NotMoved = append(news.NotMoved, c.members[at].ID)
	}
	for _, at := range m.Otherwise {
		news.Otherwise = append(news.Otherwise, c.members[at].ID)
	}
	f.Market, f.Note = news, marketNote(news)
	for at, fresh := range j.weighed.days[date].fresh {
		if fresh && c.members[at].Group == m.Group && int(c.series[at]) < j.firstNames {
			f.First = false
		}
	}
	if f.First && date < j.newest {
		f.Standing = rules.OfHistory
	}
	return f
}

func marketNote(m *rules.MarketNews) string {
	note := fmt.Sprintf("%s with a value, median distance %.1f deviations", rules.Counted(m.Reporting, "series"), m.MedianZ)
	if len(m.NotMoved)+len(m.Otherwise) == 0 {
		return note + "; all moved"
	}
	return note + someNamed("; did not move: ", m.NotMoved) + someNamed("; moved otherwise: ", m.Otherwise)
}

// someNamed names the first of some series after what they did; "" where there are none.
func someNamed(what string, all []string) string {
	if len(all) == 0 {
		return ""
	}
	names := all[:min(len(all), mostNamed)]
	s := what + strings.Join(names, ", ")
	if more := len(all) - len(names); more > 0 {
		s += fmt.Sprintf(" and %d more", more)
	}
	return s
}

// withWrong gives a reference that its followers agree is wrong a view of its own, or that reason to the view that is there.
func withWrong(date rules.Date, r *causes.Result) {
	for _, w := range r.Wrong {
		n, ok := slices.BinarySearchFunc(r.Views, w.Member, func(v causes.View, m int) int { return cmp.Compare(v.Member, m) })
		if !ok {
			r.Views = slices.Insert(r.Views, n, causes.View{Member: w.Member, Date: date})
		}
		v := &r.Views[n]
		if v.LooksLike != rules.CauseReference {
			v.LooksLike, v.Share, v.Implied = rules.CauseReference, 0, w.Implied
		}
		if v.Kind == "" {
			v.Kind = rules.KindDoubtful
		}
		v.Out = true
	}
}

// followers is how many series agree that a member is wrong, 0 where it is not.
func (d *weighedDay) followers(member int) int {
	for _, w := range d.Wrong {
		if w.Member == member {
			return w.Followers
		}
	}
	return 0
}

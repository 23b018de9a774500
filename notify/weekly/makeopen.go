package weekly

import (
	"fmt"
	"strings"
	"time"

	"strayd/rules"
)

func (b *builder) ageing() *section {
	s := &section{Key: "open", Title: "Open and ageing"}
	now, last := &b.now.Ageing, &b.last.Ageing
	s.first("Flags that ask something", both(count(now.Open), count(last.Open)))
	for n := range now.Bands {
		s.say("Open for "+bandWords(n)+" business days", counts(now.Bands[n], now.Open, last.Bands[n], last.Open))
	}
	s.Figures[len(s.Figures)-1].first = true
	s.say("Past their reply-by time, of those that have one", counts(now.PastReply, now.Replies, last.PastReply, last.Replies))
	s.say("Open after the release that they block", counts(now.PastRelease, now.Open, last.PastRelease, last.Open))
	t := table{Key: "oldest", Title: "The oldest", Empty: "Nothing is open.",
		Head: []string{"flag", "series or feed", "kind", "date", "business days", "owner", "standing", "past reply-by"}}
	for _, f := range now.Oldest {
		past := "no"
		if f.PastReply {
			past = "yes"
		}
		t.Rows = append(t.Rows, row{ref(&f.Flag), []cell{only(subject(&f.Flag)), only(text(string(f.Kind))), only(date(f.Date)), only(count(f.Days)),
			only(foreign(f.Owner)), only(text(string(f.Standing))), only(text(past))}})
	}
	s.Tables = []table{t}
	return s
}

func bandWords(n int) string {
	switch {
	case n == 0:
		return fmt.Sprintf("0-%d", rules.AgeBands[0])
	case n == len(rules.AgeBands):
		return fmt.Sprintf("more than %d", rules.AgeBands[n-1])
	}
	return fmt.Sprintf("%d-%d", rules.AgeBands[n-1]+1, rules.AgeBands[n])
}

func ref(f *rules.Flag) value { return value{fmt.Sprintf("ref %d", f.Ref), fmt.Sprint(f.Ref)} }

// subject is what a flag is about.
func subject(f *rules.Flag) value {
	switch {
	case f.Series != "":
		return foreign(f.Series)
	case f.Group != "":
		return value{"group " + foreign(f.Group).Text, f.Group}
	}
	return value{"feed " + foreign(f.Feed).Text, f.Feed}
}

func (b *builder) closed() *section {
	s := &section{Key: "closed", Title: "Closed this week"}
	now, last := &b.now.Closed, &b.last.Closed
	s.first("Flags decided", both(count(now.Decided), count(last.Decided)))
	s.say("Decided genuine", counts(now.Genuine, now.Decided, last.Genuine, last.Decided))
	s.say("Decided error", counts(now.Erroneous, now.Decided, last.Erroneous, last.Decided))
	s.say("Decided corrected", counts(now.Corrected, now.Decided, last.Corrected, last.Decided))
	hours := func(v float64) value { return real(v, 1) }
	s.say("Median hours from raised to decided", both(optional(now.MedianHours, hours), optional(last.MedianHours, hours)))
	s.say("Closed as market move with the residual out of range", counts(len(now.Overridden), now.Decided, len(last.Overridden), last.Decided))
	s.say("Decided as root, so by nobody in particular", counts(now.AsRoot, now.Decided, last.AsRoot, last.Decided))
	s.say("Acknowledgements, and sign-offs", cell{value{fmt.Sprintf("%d and %d", now.Acknowledged, now.SignedOff), fmt.Sprintf("%d;%d", now.Acknowledged, now.SignedOff)}, value{},
		value{fmt.Sprintf("%d and %d", last.Acknowledged, last.SignedOff), fmt.Sprintf("%d;%d", last.Acknowledged, last.SignedOff)}, value{}})
	t := table{Key: "reason", Title: "By reason", Head: []string{"reason", "flags of those decided"}, Empty: "Nothing was decided."}
	for n, r := range now.Reasons {
		if r.Count+last.Reasons[n].Count > 0 {
			t.Rows = append(t.Rows, row{text(string(r.Reason)), []cell{counts(r.Count, now.Decided, last.Reasons[n].Count, last.Decided)}})
		}
	}
	over := table{Key: "override", Title: "Market move with the residual out of range", Head: []string{"flag", "series", "date", "by", "note"}, Empty: "None."}
	for _, o := range now.Overridden {
		over.Rows = append(over.Rows, row{ref(&o.Flag), []cell{only(subject(&o.Flag)), only(date(o.Date)), only(foreign(o.By.String())), only(note(o.Note))}})
	}
	s.Tables = []table{t, over}
	return s
}

func (b *builder) feeds() *section {
	s := &section{Key: "feeds", Title: "Feeds"}
	last := map[string]rules.FeedFigures{}
	for _, f := range b.last.Feeds {
		last[f.Feed] = f
	}
	t := table{Key: "feed", Title: "The week", Empty: "No feed.",
		Head: []string{"feed", "on time, of dates due", "series-days, of expected", "rows", "files refused", "wrong values", "per 1,000 rows", "looked like"}}
	again := table{Key: "restated", Title: "Restatements", Empty: "No feed.", Head: []string{"feed", "values", "largest", "oldest date"}}
	trend := table{Key: "trend", Title: fmt.Sprintf("Over %d and %d weeks", rules.ShortTrend, rules.TrendWeeks), Empty: "No feed.",
		Head: []string{"feed", "on time, 4 weeks", "on time, 12 weeks", "refused, 4", "refused, 12", "restated, 4", "restated, 12"}}
	for _, f := range b.now.Feeds {
		o := last[f.Feed]
		t.Rows = append(t.Rows, row{foreign(f.Feed), []cell{portions(f.OnTime, o.OnTime), portions(f.Complete, o.Complete), both(count(f.Rows), count(o.Rows)),
			counts(f.Refused, f.Refused+f.Files, o.Refused, o.Refused+o.Files), both(count(f.Errors), count(o.Errors)), both(perThousand(&f), perThousand(&o)),
			only(text(likeWords(f.Like)))}})
		again.Rows = append(again.Rows, row{foreign(f.Feed), []cell{both(count(f.Changed), count(o.Changed)), both(optional(f.Largest, inBP), optional(o.Largest, inBP)),
			both(date(f.Oldest), date(o.Oldest))}})
		trend.Rows = append(trend.Rows, row{foreign(f.Feed), []cell{portions(f.Four.OnTime, o.Four.OnTime), portions(f.All.OnTime, o.All.OnTime),
			both(count(f.Four.Refused), count(o.Four.Refused)), both(count(f.All.Refused), count(o.All.Refused)),
			both(count(f.Four.Restated), count(o.Four.Restated)), both(count(f.All.Restated), count(o.All.Restated))}})
	}
	s.Tables = []table{t, again, trend}
	all, before := rules.Portion{}, rules.Portion{}
	for _, f := range b.now.Feeds {
		all.Add(f.OnTime)
		before.Add(last[f.Feed].OnTime)
	}
	s.first("Feed dates on time, of those due", portions(all, before))
	return s
}

func perThousand(f *rules.FeedFigures) value {
	if f.Rows == 0 {
		return value{"-", ""}
	}
	return real(1000*float64(f.Errors)/float64(f.Rows), 2)
}

func likeWords(like []rules.CauseCount) string {
	var words []string
	for _, c := range like[:min(3, len(like))] {
		words = append(words, fmt.Sprintf("%s %d", c.Cause, c.Count))
	}
	if len(words) == 0 {
		return "-"
	}
	return strings.Join(words, ", ")
}

func (b *builder) changes() *section {
	s := &section{Key: "settings", Title: "Settings"}
	s.say("Changes of the settings", both(count(len(b.now.Changes)), count(len(b.last.Changes))))
	t := table{Key: "change", Title: "Changes", Head: []string{"settings number", "at", "by", "old to new"}, Empty: "None."}
	runs := table{Key: "back-run", Title: fmt.Sprintf("The last %d dates under the settings at the week's beginning and at its end", rules.CoverDates),
		Head: []string{"what", "before, of values", "after, of values"}, Empty: "No change to run back."}
	for _, c := range b.now.Changes {
		what := c.What
		if len(what) == 0 {
			what = []string{"nothing that judges"}
		}
		t.Rows = append(t.Rows, row{count(int(c.Number)), []cell{only(moment(c.At, b.zone)), only(foreign(c.Who)), only(value{safeList(what), strings.Join(what, "; ")})}})
		for _, r := range c.BackRun {
			before, after := value{"not there", ""}, value{"not there", ""}
			cells := []cell{only(before), only(after)}
			if r.HeldBefore {
				cells[0] = cell{Now: count(r.BeyondOld), Of: count(r.JudgedOld)}
			}
			if r.HeldAfter {
				cells[1] = cell{Now: count(r.BeyondNew), Of: count(r.JudgedNew)}
			}
			subject := text("flags of every kind")
			if r.Range != "" {
				subject = foreign("beyond " + r.Range)
			}
			runs.Rows = append(runs.Rows, row{subject, cells})
		}
	}
	s.Tables = []table{t, runs}
	s.Notes = []string{"Who approved a change is for the sign-off block: the record knows who made it."}
	return s
}

func safeList(words []string) string {
	return note(strings.Join(words, "; ")).Text
}

func (b *builder) waivers() *section {
	s := &section{Key: "waivers", Title: "Waivers"}
	now, last := &b.now.Waivers, &b.last.Waivers
	s.say("Live", both(count(now.Live), count(last.Live)))
	s.say("Ending within 5 business days", counts(now.Expiring, now.Live, last.Expiring, last.Live))
	s.say("Ended in the week and not renewed", both(count(len(now.Lapsed)), count(len(last.Lapsed))))
	t := table{Key: "waiver", Title: "Ending soon, or ended", Head: []string{"flag", "series or feed", "until", "by", "note"}, Empty: "None."}
	for _, list := range [][]rules.Flag{now.Lapsed, now.Soon} {
		for i := range list {
			f := &list[i]
			t.Rows = append(t.Rows, row{ref(f), []cell{only(subject(f)), only(date(f.Last.Until)), only(foreign(f.Last.By.String())), only(note(f.Last.Note))}})
		}
	}
	s.Tables = []table{t}
	return s
}

func (b *builder) runs() *section {
	s := &section{Key: "runs", Title: "Run record"}
	now, last := &b.now.Runs, &b.last.Runs
	due := func(n int) value {
		if n == 0 {
			return value{"no schedule", ""}
		}
		return count(n)
	}
	s.say("Passes due by the schedules", both(due(now.Due), due(last.Due)))
	s.say("Passes made", both(count(now.Made), count(last.Made)))
	s.first("Passes failed, of those made", counts(now.Failed, now.Made, last.Failed, last.Made))
	s.say("Longest time without a pass that ended well, hours", both(hoursOf(now.Quiet), hoursOf(last.Quiet)))
	s.say("Messages sent", counts(now.Sent, now.Notices, last.Sent, last.Notices))
	s.say("Messages failed for good", counts(now.Undone, now.Notices, last.Undone, last.Notices))
	s.say("Messages that wait", counts(now.Waiting, now.Notices, last.Waiting, last.Notices))
	return s
}

func hoursOf(d time.Duration) value { return real(d.Hours(), 1) }

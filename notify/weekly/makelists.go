package weekly

import (
	"fmt"

	"strayd/rules"
)

func (b *builder) largest() *section {
	s := &section{Key: "largest", Title: "Largest outliers"}
	t := table{Key: "flag", Title: "By tail, the rarest first", Empty: "No flag with a tail.",
		Head: []string{"flag", "series", "date", "kind", "return", "range", "z", "how rare", "reference", "unexplained", "looks like", "standing"}}
	for i := range b.now.Largest {
		f := &b.now.Largest[i]
		t.Rows = append(t.Rows, row{ref(f), []cell{only(subject(f)), only(date(f.Date)), only(text(string(f.Kind))), only(units(f.Return)), only(between(f)),
			only(optional(f.Z, func(v float64) value { return value{fmt.Sprintf("%+.1f", v), real(v, 1).Raw} })), only(rare(f)),
			only(reference(f)), only(optional(f.Residual, fraction)), only(like(f)), only(text(string(f.Standing)))}})
	}
	s.Tables = []table{t}
	s.say("Listed, of the flags of the week's dates", counts(len(b.now.Largest), b.now.Flags, len(b.last.Largest), b.last.Flags))
	return s
}

func between(f *rules.Flag) value {
	words := rules.Between(f.Low, f.High)
	if words == "" {
		return value{"-", ""}
	}
	end := func(n rules.Num) string { return optional(n, fraction).Raw }
	return value{words, end(f.Low) + ".." + end(f.High)}
}

// rare is the waiting time of a tail; the logarithm holds where the tail itself is too small for a number.
func rare(f *rules.Flag) value {
	if !f.Tail.OK || f.Tail.V <= 0 {
		return value{"-", ""}
	}
	return value{rules.OnceIn(f.Tail.V), real(f.Tail.V, 6).Raw}
}

func reference(f *rules.Flag) value {
	if f.Reference == "" {
		return value{"-", ""}
	}
	v := foreign(f.Reference)
	if f.ReferenceReturn.OK {
		return value{v.Text + " " + rules.InPercent(f.ReferenceReturn.V), real(f.ReferenceReturn.V, 6).Raw}
	}
	return v
}

func like(f *rules.Flag) value {
	if f.LooksLike == "" {
		return value{"-", ""}
	}
	return text(string(f.LooksLike))
}

func (b *builder) repeats() *section {
	s := &section{Key: "repeats", Title: "Repeat offenders"}
	s.say("Series with 3 flagged dates in 20, or a reason twice in 60", both(count(len(b.now.Repeats)), count(len(b.last.Repeats))))
	last := map[string]rules.Repeat{}
	for _, r := range b.last.Repeats {
		last[r.Series] = r
	}
	t := table{Key: "series", Title: "Candidates for a new range, a new source, or a conversation", Empty: "None.",
		Head: []string{"series", "group", "flagged dates in 20", "reason given again", "times in 60"}}
	for n, r := range b.now.Repeats {
		if n == rules.MostRepeats {
			t.Rows = append(t.Rows, row{text(fmt.Sprintf("and %s more", rules.Thousands(len(b.now.Repeats)-n))), nil})
			break
		}
		o := last[r.Series]
		reason := "-"
		if r.Reason != "" {
			reason = string(r.Reason)
		}
		t.Rows = append(t.Rows, row{foreign(r.Series), []cell{only(foreign(r.Group)), both(count(r.Flags), count(o.Flags)), only(text(reason)), both(count(r.Times), count(o.Times))}})
	}
	s.Tables = []table{t}
	s.Notes = []string{"Flags about a value, on different dates; the reasons are those of decisions, market moves left out."}
	return s
}

func (b *builder) thin() *section {
	s := &section{Key: "thin", Title: "Stale and provisional"}
	now, last := &b.now.Thin, &b.last.Thin
	s.say("Provisional: under 20 observations", counts(now.Provisional.Count, now.Series, last.Provisional.Count, last.Series))
	s.say("Not judged: too few observations, or all the same", counts(now.Unjudged.Count, now.Series, last.Unjudged.Count, last.Series))
	s.say("Nothing but zeros in the week", counts(now.Zero.Count, now.Series, last.Zero.Count, last.Series))
	s.say("Dormant: no value for long, and not known to have ended", both(count(now.Dormant.Count), count(last.Dormant.Count)))
	s.say("Flags stale or repeat", counts(kind(b.now, rules.KindStale)+kind(b.now, rules.KindRepeat), b.now.Flags,
		kind(b.last, rules.KindStale)+kind(b.last, rules.KindRepeat), b.last.Flags))
	t := table{Key: "series", Title: "By name", Head: []string{"which", "series"}, Empty: "None."}
	for _, list := range []struct {
		what  string
		names *rules.Naming
	}{{"provisional", &now.Provisional}, {"not judged", &now.Unjudged}, {"zeros", &now.Zero}, {"dormant", &now.Dormant}} {
		if list.names.Count > 0 {
			t.Rows = append(t.Rows, row{text(list.what), []cell{only(note(list.names.String()))}})
		}
	}
	s.Tables = []table{t}
	return s
}

func (b *builder) slow() *section {
	s := &section{Key: "slow", Title: "Slow-burn"}
	for _, k := range []struct {
		kind  rules.Kind
		words string
	}{{rules.KindDrift, "Drift: a small bias that persists"}, {rules.KindVolatility, "Volatility: another scale over weeks"},
		{rules.KindMisfit, "Misfit: the reference explains less than it did"}} {
		s.say(k.words, counts(kind(b.now, k.kind), b.now.Flags, kind(b.last, k.kind), b.last.Flags))
	}
	t := table{Key: "flag", Title: "Log only, no alert", Head: []string{"flag", "series", "kind", "date", "note"}, Empty: "None."}
	for i := range b.now.Slow {
		f := &b.now.Slow[i]
		t.Rows = append(t.Rows, row{ref(f), []cell{only(subject(f)), only(text(string(f.Kind))), only(date(f.Date)), only(note(f.Note))}})
	}
	s.Tables = []table{t}
	return s
}

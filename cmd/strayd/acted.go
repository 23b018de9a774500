package main

import (
	"fmt"
	"slices"
	"strings"

	"strayd/rules"
	"strayd/watcher"
)

// sayActed prints what an act brought about.
func (a *app) sayActed(answer *watcher.Answer) error {
	e := &answer.Entry
	for i := range answer.Flags {
		f := &answer.Flags[i]
		fmt.Fprintf(a.out, "Flag %d, %s: %s%s, by %s.\n", f.Ref, flagWords(f), f.Standing, actWords(f.Last), e.By)
	}
	if e.By.Root() {
		fmt.Fprintln(a.err, "note: done as root, which the record says: it may be anybody who has that right")
	}
	for _, n := range answer.Notes {
		fmt.Fprintln(a.out, upper(n)+".")
	}
	if len(e.Second) > 0 && e.Deed != rules.SignOff && e.Deed != rules.Acknowledge {
		fmt.Fprintf(a.out, "A second person must agree: strayd sign-off %s\n", refWords(e.Second))
	}
	return a.sayDiffers(e)
}

// beyondAgain says of which flags the corrected value is itself beyond the line that was broken, or beyond a limit.
func beyondAgain(s *rules.Settings, answer *watcher.Answer) (notes []string) {
	act := &answer.Entry.Act
	if act.Deed != rules.Decide || act.Conclusion != rules.Corrected {
		return nil
	}
	members, err := rules.NewMembership(s)
	if err != nil {
		return nil // the settings were checked when they were read
	}
	x := act.Value.Float()
	say := func(series, of string, low, high rules.Num) {
		n := fmt.Sprintf("the corrected value %s of %s is itself beyond the %s, %s; if that is not meant, decide again", rules.InPercent(x), printable(series), of,
			rules.Between(low, high))
		if (low.OK && x < low.V || high.OK && x > high.V) && !slices.Contains(notes, n) {
			notes = append(notes, n)
		}
	}
	for i := range answer.Flags {
		f := &answer.Flags[i]
		if f.Kind != rules.KindLimit {
			say(f.Series, "breach line of range "+f.Range, f.Low, f.High)
		}
		for n := range s.Ranges {
			if r := &s.Ranges[n]; r.Limit != nil && members.Applies(n, f.Series, f.Group) {
				say(f.Series, "limit "+r.Name, rules.Some(r.Limit.Low.Float()), rules.Some(r.Limit.High.Float()))
			}
		}
	}
	return notes
}

func upper(s string) string { return strings.ToUpper(s[:1]) + s[1:] }

func refWords(refs []uint64) string {
	var words []string
	for _, r := range refs {
		words = append(words, fmt.Sprint(r))
	}
	return strings.Join(words, " ")
}

// flagWords say what a flag is about.
func flagWords(f *rules.Flag) string {
	s := string(f.Kind) + " " + printable(flagSubject(f))
	if f.Return != rules.Missing {
		s += " " + rules.InPercent(f.Return.Float())
	}
	if f.Date != rules.NoDate {
		s += " for " + f.Date.Day()
	}
	return s
}

// flagSubject is the series, the group, or the feed with its file that a flag is about.
func flagSubject(f *rules.Flag) string {
	switch {
	case f.Series != "":
		return f.Series
	case f.Group != "":
		return "group " + f.Group
	}
	return strings.TrimSuffix(f.Feed+": "+f.File, ": ")
}

// actWords say what else an act says beside the standing that it leads to.
func actWords(act *rules.Act) string {
	var parts []string
	switch act.Deed {
	case rules.Decide:
		parts = append(parts, act.Words())
	case rules.Waive, rules.SignOff:
		if act.Until == rules.NoDate {
			break
		}
		parts = append(parts, "until "+act.Until.Day())
	case rules.Accept:
		parts = append(parts, "released")
	}
	if act.Reason != "" {
		parts = append(parts, string(act.Reason))
	}
	if act.Override != "" {
		parts = append(parts, "overridden: "+printable(act.Override))
	}
	if act.Note != "" {
		parts = append(parts, printable(act.Note))
	}
	if len(parts) == 0 {
		return ""
	}
	return " (" + strings.Join(parts, "; ") + ")"
}

// mostSaid is how many differing observations are printed; the record has more.
const mostSaid = 20

// sayDiffers lists what the replayed windows would say otherwise.
func (a *app) sayDiffers(e *rules.Entry) error {
	if e.Deed != rules.Decide {
		return nil
	}
	if len(e.Differ) == 0 {
		fmt.Fprintln(a.out, "The windows are replayed; no later verdict would be another.")
		return nil
	}
	fmt.Fprintln(a.out, "The windows are replayed. What they would now say otherwise (the verdicts that were issued stand):")
	w := columns(a.out)
	for _, d := range e.Differ[:min(len(e.Differ), mostSaid)] {
		would := "would now be a breach"
		if d.Issued == rules.Breach {
			would = "would be none now"
		}
		fields(w, "  "+printable(d.Series), d.Date.Day(), "range "+d.Range, string(d.Issued), would)
	}
	if err := w.Flush(); err != nil {
		return err
	}
	if more := len(e.Differ) - mostSaid + e.More; more > 0 {
		fmt.Fprintf(a.out, "  and %s more\n", rules.Thousands(more))
	}
	return nil
}

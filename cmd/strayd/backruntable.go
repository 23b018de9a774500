package main

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"strayd/rules"
	"strayd/rules/backrun"
	"strayd/stats"
)

// mostChanges is how many changes the table names.
const mostChanges = 15

func (r *backRunning) print() error {
	if r.options.format != "table" {
		return r.list()
	}
	r.printHead()
	for _, part := range []func() error{r.printCounts, r.printCoverage, r.printZones, r.printChanges, r.printDecisions} {
		if err := part(); err != nil {
			return err
		}
	}
	r.printAdvice()
	_, err := fmt.Fprintf(r.app.out, "\n%s\n", backRunCaution)
	return err
}

// sideWords name the sides in columns.
var sideWords = []string{"these", "other"}

func (r *backRunning) sides() []string { return sideWords[:len(r.names)] }

func (r *backRunning) printHead() {
	d, out := r.compare.Dates, r.app.out
	fmt.Fprintf(out, "%s judged again; compared are %s on %s, %s to %s (%.1f weeks of five dates). Nothing is changed.\n",
		rules.Counted(r.past.Values, "value"), rules.Thousands(r.compare.Values), rules.Counted(len(d), "date"), d[0], d[len(d)-1], r.compare.Weeks())
	if len(d) < backrun.LeastDates {
		fmt.Fprintf(out, "Fewer than %d dates are too little data to say much of a week.\n", backrun.LeastDates)
	}
	for n, name := range r.names {
		fmt.Fprintf(out, "%s: %s\n", sideWords[n], printable(name))
	}
	for _, words := range r.unlike {
		fmt.Fprintf(out, "  %s\n", printable(words))
	}
	if len(r.names) == 2 && len(r.unlike) == 0 {
		fmt.Fprintln(out, "  nothing that judges is different")
	}
}

func (r *backRunning) printCounts() error {
	w := columns(r.app.out)
	head := []string{"flags"}
	for _, side := range r.sides() {
		head = append(head, side+", a week", "in all")
	}
	fields(w)
	fields(w, head...)
	for _, c := range r.compare.Counts() {
		row := []string{countName(&c)}
		for _, n := range c.Flags {
			week := "-"
			if c.Kind != backrun.Busiest {
				week = fmt.Sprintf("%.2f", float64(n)/r.compare.Weeks())
			}
			row = append(row, week, rules.Thousands(n))
		}
		fields(w, row...)
	}
	for _, doubts := range []bool{false, true} {
		fields(w, r.expectedRow(doubts)...)
	}
	return w.Flush()
}

// expectedRow is what the lines promise beyond them, or how much is doubted at most.
func (r *backRunning) expectedRow(doubts bool) []string {
	row := []string{"expected beyond breach lines"}
	if doubts {
		row[0] = "doubtful, stale, repeat at most"
	}
	for _, s := range r.compare.Sides {
		n, most := r.compare.Expected(s)
		if doubts {
			n = most
		}
		row = append(row, fmt.Sprintf("%.2f", n/r.compare.Weeks()), fmt.Sprintf("%.1f", n))
	}
	return row
}

func countName(c *backrun.Count) string {
	switch {
	case c.Group != "":
		return "group " + printable(c.Group)
	case c.Kind == backrun.Events:
		return "separate events"
	}
	return string(c.Kind)
}

func (r *backRunning) printCoverage() error {
	if !r.estimated() {
		_, err := fmt.Fprintf(r.app.out, "\nNo range is estimated, or none has judged anything: there is no coverage to speak of.\n")
		return err
	}
	w := columns(r.app.out)
	fields(w)
	fields(w, "range and group", "side", "line", "beyond, of judged", "expected", "Kupiec p", "p, together", "verdict", "Christoffersen p")
	r.eachCover(func(n int, c *rules.CoverFigures) {
		line := func(share float64, t rules.CoverTally, says rules.Coverage) {
			if share == 0 {
				fields(w, coverWords(c), sideWords[n], "no share", partOf(t.Beyond, t.Judged), "-", "-", "-", "the line promises no share", "-")
				return
			}
			fields(w, coverWords(c), sideWords[n], rules.InPercentPlain(share), partOf(t.Beyond, t.Judged), fmt.Sprintf("%.1f", says.Expected),
				chanceWords(says.Kupiec), chanceWords(says.Moving), string(says.Verdict), chanceWords(says.Apart))
		}
		line(c.Share, c.Inner, c.InnerSays)
		line(c.Level, c.Outer, c.OuterSays)
	})
	return w.Flush()
}

// estimated says that some estimated range has judged something.
func (r *backRunning) estimated() bool {
	return slices.ContainsFunc(r.compare.Sides, func(s *backrun.Side) bool { return len(s.Covers) > 0 })
}

// eachCover goes through what the sides have of every range and group, those of one beside each other.
func (r *backRunning) eachCover(do func(side int, c *rules.CoverFigures)) {
	tables := make([][]rules.CoverFigures, len(r.compare.Sides))
	var order []string
	for n, s := range r.compare.Sides {
		tables[n] = rules.CoverTable(s.Covers)
		for i := range tables[n] {
			if word := coverWords(&tables[n][i]); !slices.Contains(order, word) {
				order = append(order, word)
			}
		}
	}
	for _, word := range order {
		for n := range tables {
			if i := slices.IndexFunc(tables[n], func(c rules.CoverFigures) bool { return coverWords(&c) == word }); i >= 0 {
				do(n, &tables[n][i])
			}
		}
	}
}

func coverWords(c *rules.CoverFigures) string {
	if c.Group == "" {
		return printable(c.Range) + ", all"
	}
	return printable(c.Range) + ", " + printable(c.Group)
}

func partOf(n, of int) string { return rules.Thousands(n) + " of " + rules.Thousands(of) }

func chanceWords(p rules.Num) string {
	switch {
	case !p.OK:
		return "-"
	case p.V < 0.001:
		return "under 0.001"
	}
	return fmt.Sprintf("%.3f", p.V)
}

func (r *backRunning) printZones() error {
	if !r.estimated() {
		return nil
	}
	w := columns(r.app.out)
	fields(w)
	fields(w, "zones of the series", "side", "green", "yellow", "red", "more than 4, by chance", "none, by chance")
	r.eachCover(func(n int, c *rules.CoverFigures) {
		whole := c.Zones.Whole()
		if whole == 0 {
			fields(w, coverWords(c), sideWords[n], "too little data to say: no series has 250 judged values")
			return
		}
		many, none := c.Chance()
		fields(w, coverWords(c), sideWords[n], partOf(c.Zones.Green, whole), partOf(c.Zones.Yellow, whole), partOf(c.Zones.Red, whole),
			fmt.Sprintf("%d, %.1f", len(c.Notable), many), fmt.Sprintf("%d, %.1f", c.None, none))
	})
	return w.Flush()
}

func (r *backRunning) printChanges() error {
	if len(r.names) < 2 {
		return nil
	}
	changes, kept := r.compare.Changes()
	count := map[backrun.Turn]int{}
	for i := range changes {
		count[changes[i].Turn]++
	}
	fmt.Fprintf(r.app.out, "\nFlagged by both: %s, of which %d as another kind. Only by the other settings: %d appear. Only by these: %d vanish.\n",
		rules.Counted(kept, "value"), count[backrun.Turns], count[backrun.Appears], count[backrun.Vanishes])
	if len(changes) == 0 {
		return nil
	}
	shown := slices.Clone(changes)
	slices.SortStableFunc(shown, func(a, b backrun.Change) int { return cmp.Compare(tailOrder(&a.Flag), tailOrder(&b.Flag)) })
	shown = shown[:min(mostChanges, len(shown))]
	w := columns(r.app.out)
	fields(w, "change", "series", "date", "kind", "range", "return", "expected", "ref", "decided")
	for i := range shown {
		fields(w, changeFields(&shown[i])...)
	}
	if err := w.Flush(); err != nil {
		return err
	}
	if more := len(changes) - len(shown); more > 0 {
		fmt.Fprintf(r.app.out, "and %d more with larger tails; --changed FILE lists all\n", more)
	}
	return nil
}

// tailOrder puts the rarest first, and what has no tail last.
func tailOrder(f *rules.Flag) float64 {
	if !f.Log10.OK {
		return 1
	}
	return f.Log10.V
}

func changeFields(c *backrun.Change) []string {
	f := &c.Flag
	ref, decided, kind, about := "-", "-", string(f.Kind), f.Series
	if about == "" {
		about = "group " + f.Group
	}
	if c.Issued != nil {
		ref, decided = strconv.FormatUint(c.Issued.Ref, 10), string(c.Issued.Standing)
		if c.Issued.Decided != nil {
			decided = c.Issued.Decided.Words()
		}
	}
	if c.Before != "" {
		kind = string(c.Before) + " to " + kind
	}
	value := "-"
	if f.Return != rules.Missing {
		value = rules.InPercent(f.Return.Float())
	}
	expected := "-"
	if f.Low.OK || f.High.OK {
		expected = percentNum(f.Low) + " to " + percentNum(f.High)
	}
	return []string{string(c.Turn), printable(about), f.Date.String(), kind, printable(either(f.Range, "-")), value, expected, ref, decided}
}

func either(s, empty string) string {
	if s == "" {
		return empty
	}
	return s
}

func (r *backRunning) printDecisions() error {
	all, sum := r.compare.Decisions(), 0
	for _, d := range all {
		sum += d.Decided
	}
	if sum == 0 {
		fmt.Fprintf(r.app.out, "\nNothing about these dates was decided so far, so that nothing speaks for or against.\n")
		return nil
	}
	w := columns(r.app.out)
	fields(w)
	head := []string{"decided", "values"}
	for _, side := range r.sides() {
		head = append(head, side+" flag")
	}
	if len(r.names) == 2 {
		head = append(head, "only other", "only these")
	}
	fields(w, head...)
	for _, d := range all {
		row := []string{string(d.Conclusion), fmt.Sprint(d.Decided)}
		for _, n := range d.Flagged {
			row = append(row, partOf(n, d.Decided))
		}
		if len(r.names) == 2 {
			row = append(row, fmt.Sprint(d.Gained), fmt.Sprint(d.Lost))
		}
		fields(w, row...)
	}
	if err := w.Flush(); err != nil || len(r.names) < 2 {
		return err
	}
	pro, con := backrun.Balance(all)
	_, err := fmt.Fprintf(r.app.out,
		"Where wrong values matter: %d for the other settings (wrong ones gained, genuine ones lost), %d against, of %d decided.\n"+
			"Where every large move matters, a genuine one that is no longer flagged speaks against them.\n", pro, con, sum)
	return err
}

func (r *backRunning) printAdvice() {
	a, out := r.advice, r.app.out
	if a == nil {
		return
	}
	fmt.Fprintf(out, "\nFor a budget of %g flags a week: ", a.Budget)
	if a.Level == 0 {
		fmt.Fprintf(out, "no line. %s.\n", a.Why)
		return
	}
	actual := float64(r.compare.Counts()[0].Flags[1]) / r.compare.Weeks()
	fmt.Fprintf(out, "breach: {tail: %s}, which is about one in %.0f.\n", strings.ReplaceAll(rules.InPercentPlain(a.Level), " ", ""), 1/a.Level)
	if a.Why != "" {
		fmt.Fprintf(out, "  Not what the budget asks for: %s.\n", a.Why)
	}
	for _, name := range r.kept {
		fmt.Fprintf(out, "  Range %s keeps its own line: the level does not go with its window or its watch line.\n", printable(name))
	}
	fmt.Fprintf(out, "  Judged again under it: %.2f flags a week. By resampling the dates in blocks of 20: %.2f to %.2f (middle 90 %%).\n",
		actual, a.RateLow, a.RateHigh)
	fmt.Fprintf(out, "  Another past of this length might have given a line between %s and %s.\n", levelWords(a.LevelLow), levelWords(a.LevelHigh))
	if a.HalfLevel.OK {
		fmt.Fprintf(out, "  Chosen on the first half of the dates alone: %s, with %.2f a week in the second half.\n",
			levelWords(a.HalfLevel.V), a.HalfRate.V)
	}
}

func levelWords(level float64) string {
	if level == 0 {
		return "none"
	}
	return strconv.FormatFloat(100*level, 'g', 2, 64) + " %"
}

// conditional is Christoffersen's joint test of share and independence.
func conditional(t rules.CoverTally, share float64) rules.Num {
	kupiec, err := stats.Kupiec(t.Beyond, t.Judged, share)
	if err != nil {
		return rules.Num{}
	}
	return rules.Some(stats.Conditional(kupiec, t.Transitions.Independence()).P)
}

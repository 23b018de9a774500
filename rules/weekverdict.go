package rules

import (
	"fmt"
	"strconv"
	"strings"
	"time"
)

// WeekWord is the verdict on a week in one word.
type WeekWord string

// The verdicts on a week.
const (
	Holds   WeekWord = "holds" // nothing in the record asks anything of a manager
	Look    WeekWord = "look"  // something is worth a look
	MustAct WeekWord = "act"   // something does not wait
)

// WeekLog is the managers' page: the figures of one week with those of the week before, and what they come to.
type WeekLog struct {
	Made    time.Time
	By      string // who or what made it
	Program string
	Zone    *time.Location
	Now     *WeekFigures
	Last    *WeekFigures
	Word    WeekWord
	Why     []string // reasons, the gravest first
}

// NewWeekLog works out two weeks and what the newer one comes to.
func NewWeekLog(now, last *WeekFacts) *WeekLog {
	l := &WeekLog{Zone: now.Zone, Now: now.Figures(), Last: last.Figures()}
	l.Word, l.Why = l.Now.verdict()
	return l
}

// Sentence says the verdict and why, in one sentence of at most three reasons, and how many flags nobody has decided.
func (l *WeekLog) Sentence() string {
	why := l.Why[:min(3, len(l.Why))]
	s := strings.ToUpper(string(l.Word)[:1]) + string(l.Word)[1:] + ": " + strings.Join(why, "; ")
	if more := len(l.Why) - len(why); more > 0 {
		s += fmt.Sprintf("; and %d more", more)
	}
	if open := l.Now.Ageing.Open; open > 0 {
		s += fmt.Sprintf("; %s open and undecided", Counted(open, "flag"))
	}
	return s + "."
}

const (
	// leastChecked is the share of the expected series-days below which a week was not watched.
	leastChecked = 0.9
	// quietHours is how long a schedule may stand still, over a weekend with a day on either side.
	quietHours = 4 * 24
)

func (w *WeekFigures) verdict() (WeekWord, []string) {
	act, look := w.actReasons(), w.lookReasons()
	switch {
	case len(act) > 0:
		return MustAct, append(act, look...)
	case len(look) > 0:
		return Look, look
	}
	return Holds, []string{fmt.Sprintf("%s of %s expected series-days checked, nothing late, refused, overdue or out of its promise",
		Thousands(w.Checked.Part), Thousands(w.Checked.Whole))}
}

// reasons gathers sentences that apply.
type reasons []string

func (r *reasons) when(applies bool, format string, args ...any) {
	if applies {
		*r = append(*r, fmt.Sprintf(format, args...))
	}
}

func (w *WeekFigures) actReasons() (r reasons) {
	r.when(w.Checked.Whole == 0, "nothing was checked")
	r.when(w.unwatched(), "only %s of %s expected series-days were checked",
		Thousands(w.Checked.Part), Thousands(w.Checked.Whole))
	old := w.Ageing.Bands[len(AgeBands)]
	r.when(old > 0, "%s open for more than %d business days", Counted(old, "flag"), AgeBands[len(AgeBands)-1])
	r.when(w.Ageing.PastRelease > 0, "%s still open after the release that it blocks", Counted(w.Ageing.PastRelease, "flag"))
	r.when(w.Closed.ByClient > 0, "%s found by a client", Counted(w.Closed.ByClient, "error"))
	r.when(w.Found.Material > 0, "%s at or above the materiality that you set", Counted(w.Found.Material, "error"))
	for i := range w.Covers {
		c := &w.Covers[i]
		r.when(c.Group == "" && c.Zones.Red > 0, "%d of %d series are in the red zone of range %s", c.Zones.Red, c.Zones.Whole(), c.Range)
	}
	r.when(w.Runs.Failed > 0, "%d of %s failed", w.Runs.Failed, Counted(w.Runs.Made, "pass"))
	r.when(w.Runs.Undone > 0, "%d of %s failed for good", w.Runs.Undone, Counted(w.Runs.Notices, "message"))
	return r
}

// unwatched says that too little of what was expected was checked.
func (w *WeekFigures) unwatched() bool {
	return w.Checked.Whole > 0 && float64(w.Checked.Part) < leastChecked*float64(w.Checked.Whole)
}

func (w *WeekFigures) lookReasons() (r reasons) {
	for _, x := range w.Ranges {
		r.when(x.Level > 0 && x.Judged > 0 && x.Separate > x.Wide, "range %s has %s where %.1f were expected and up to %d are usual", x.Range,
			Counted(x.Separate, "separate breach"), x.Expected, x.Wide)
	}
	for i := range w.Covers {
		c := &w.Covers[i]
		of := "all groups"
		if c.Group != "" {
			of = "group " + c.Group
		}
		for _, line := range []struct {
			share float64
			Coverage
		}{{c.Share, c.InnerSays}, {c.Level, c.OuterSays}} {
			r.when(line.Verdict == TooMany || line.Verdict == TooFew, "range %s over %s: %s beyond the %s line, %s of %s", c.Range, of, line.Verdict,
				InPercentPlain(line.share), Thousands(line.Beyond), Thousands(line.Judged))
		}
	}
	r.when(w.Checked.Part < w.Checked.Whole && !w.unwatched(), "%s of %s expected series-days have no value", Thousands(w.Checked.Whole-w.Checked.Part), Thousands(w.Checked.Whole))
	r.when(w.Ageing.PastReply > 0, "%s past the reply-by time", Counted(w.Ageing.PastReply, "flag"))
	for _, x := range w.Feeds {
		r.when(x.OnTime.Part < x.OnTime.Whole, "feed %s was late for %d of %d dates", x.Feed, x.OnTime.Whole-x.OnTime.Part, x.OnTime.Whole)
		r.when(x.Refused > 0, "%s of feed %s refused", Counted(x.Refused, "file"), x.Feed)
	}
	r.when(len(w.Closed.Overridden) > 0, "%s closed as market move with the residual out of range", Counted(len(w.Closed.Overridden), "flag"))
	r.when(len(w.Waivers.Lapsed) > 0, "%s ran out unrenewed", Counted(len(w.Waivers.Lapsed), "waiver"))
	r.when(len(w.Changes) > 0, "the settings were changed %s", times(len(w.Changes)))
	r.when(w.Runs.Quiet.Hours() > quietHours, "%.0f hours without a pass", w.Runs.Quiet.Hours())
	return r
}

func times(n int) string {
	if n == 1 {
		return "once"
	}
	return fmt.Sprintf("%d times", n)
}

// InPercentPlain writes a share for a person, without a sign and with no more digits than it has: "1 %", "0.27 %".
func InPercentPlain(share float64) string { return strconv.FormatFloat(100*share, 'g', 6, 64) + " %" }

package health

import (
	"fmt"
	"time"
)

const (
	// staleAfter is how old the last beat may be. The loop beats at least twice a minute.
	staleAfter = 2 * time.Minute
	// undeliveredAfter is how long a notice may wait.
	undeliveredAfter = 15 * time.Minute
	// overdueAfter is how many of its intervals a job's due slot may wait.
	overdueAfter = 2
)

// look is a report with what follows from it.
type look struct {
	Report
	alive    bool
	unready  []string // why it is not ready
	troubles []string
}

func lookAt(r Report, stale time.Duration) *look {
	l := &look{Report: r, alive: !r.Beat.IsZero() && r.Now.Sub(r.Beat).Abs() <= stale}
	if !l.alive {
		l.troubles = append(l.troubles, l.silence(stale))
	}
	l.unready = r.unready()
	l.troubles = append(l.troubles, l.unready...)
	for _, c := range r.Channels {
		l.troubles = append(l.troubles, c.troubles(r.Now)...)
	}
	for _, j := range r.Jobs {
		if j.overdue(r.Now) {
			l.troubles = append(l.troubles, fmt.Sprintf("job %q has been due since %s, more than twice its interval of %v", j.Name, stamp(j.NextSlot), j.Every))
		}
	}
	return l
}

func (l *look) ready() bool   { return len(l.unready) == 0 }
func (l *look) healthy() bool { return len(l.troubles) == 0 }

// silence says why the daemon does not count as alive.
func (l *look) silence(stale time.Duration) string {
	if l.Beat.IsZero() {
		return "the loop has not begun"
	}
	return fmt.Sprintf("the loop has given no sign of life for %v, the limit is %v", l.Now.Sub(l.Beat).Abs().Round(time.Second), stale)
}

func (r *Report) unready() []string {
	var why []string
	for _, c := range []struct {
		holds bool
		text  string
	}{
		{!r.Ledger.Open, "the ledger is not open"},
		{!r.Configuration.Valid, "no valid configuration is in force"},
		{r.Stopping, "the daemon is stopping"},
	} {
		if c.holds {
			why = append(why, c.text)
		}
	}
	return why
}

func (c *Channel) troubles(now time.Time) []string {
	var all []string
	switch {
	case c.State == ChannelDead:
		all = append(all, fmt.Sprintf("channel %q is dead: %s%s", c.Name, c.Reason, c.standIn()))
	case c.Fallback != "":
		all = append(all, fmt.Sprintf("channel %q delivers nothing%s", c.Name, c.standIn()))
	}
	if age := c.age(now); age > undeliveredAfter {
		all = append(all, fmt.Sprintf("channel %q has a notice that has waited for %v, the limit is %v", c.Name, age.Round(time.Second), undeliveredAfter))
	}
	return all
}

// standIn names the channel that has taken over.
func (c *Channel) standIn() string {
	if c.Fallback == "" {
		return ""
	}
	return fmt.Sprintf(", channel %q stands in", c.Fallback)
}

// age is how long the oldest waiting notice has waited; 0 when none waits.
func (c *Channel) age(now time.Time) time.Duration {
	if c.Oldest.IsZero() {
		return 0
	}
	return max(0, now.Sub(c.Oldest))
}

// overdue says whether the job's next slot has been due for more than twice its interval.
func (j *Job) overdue(now time.Time) bool {
	return j.Every > 0 && !j.NextSlot.IsZero() && now.Sub(j.NextSlot) > overdueAfter*j.Every
}

// stamp is a time as the pages show it.
func stamp(t time.Time) string { return t.UTC().Format("2006-01-02T15:04:05.000Z07:00") }

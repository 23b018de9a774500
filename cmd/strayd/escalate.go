package main

import (
	"cmp"
	"context"
	"slices"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

const (
	escalationJob  = "escalation"
	escalationSpec = "*/5 * * * *"
	// passedOn is the slot that holds up to where flags were looked at.
	passedOn = "passed on"
)

// timed says whether some group has times to keep.
func timed(c *config.Config) bool {
	return slices.ContainsFunc(c.Groups, func(g rules.Group) bool { return g.Reply > 0 || g.Release != nil })
}

// escalate passes the flags on whose times have come since it was last called, up to a moment. It begins with the first call.
func escalate(c *config.Config, l *ledger.Ledger, teller *notify.Teller, upto time.Time) error {
	since, err := l.LastSlot(passedOn)
	if err != nil || !upto.After(since) {
		return err
	}
	if !since.IsZero() {
		v, err := l.View()
		if err != nil {
			return err
		}
		news, err := escalations(c, v, teller, since, upto)
		v.Close() //nolint:errcheck // only read
		if err != nil {
			return err
		}
		var notices []rules.Notice
		for _, n := range news {
			notices = append(notices, teller.Escalations(n)...)
		}
		if len(notices) > 0 {
			err = l.Add(notices)
		}
		if err != nil {
			return err
		}
	}
	return l.Done(passedOn, upto)
}

// escalations are the flags that still ask something and reached a stage after one moment and no later than another, by group and stage.
func escalations(c *config.Config, v watcher.View, teller *notify.Teller, since, upto time.Time) (news []rules.EscalationNews, err error) {
	r, err := watcher.NewReader(v)
	if err != nil {
		return nil, err
	}
	today := rules.DateFrom(upto.In(c.Location))
	var failed error
	err = v.Flags(false, func(f rules.Flag) bool {
		if f.Kind.Slow() || !f.AsksOn(today) {
			return true
		}
		asked, err := askedSince(r, &f)
		if failed = err; err != nil {
			return false
		}
		g := groupOf(c, f.Group)
		for _, s := range f.Steps(&g, asked, readAt(teller, &f, asked), c.Calendar.Days, c.Location) {
			if s.At.After(since) && !s.At.After(upto) && s.Fits(&f, today) {
				news = reached(news, g, s, f, upto)
			}
		}
		return true
	})
	slices.SortStableFunc(news, func(x, y rules.EscalationNews) int {
		return cmp.Or(x.Step.At.Compare(y.Step.At), cmp.Compare(x.Group.Name, y.Group.Name), cmp.Compare(x.Stage, y.Stage))
	})
	return news, cmp.Or(err, failed)
}

// reached adds a flag to the news of its group and stage.
func reached(news []rules.EscalationNews, g rules.Group, s rules.Step, f rules.Flag, now time.Time) []rules.EscalationNews {
	at := slices.IndexFunc(news, func(n rules.EscalationNews) bool {
		return n.Group.Name == g.Name && n.Stage == s.Stage && n.Days == s.Days && n.Due.Equal(s.Due)
	})
	if at < 0 {
		return append(news, rules.EscalationNews{At: now, Group: g, Step: s, Flags: []rules.Flag{f}})
	}
	news[at].Flags = append(news[at].Flags, f)
	return news
}

// askedSince is when a flag began to ask as it does now.
func askedSince(r *watcher.Reader, f *rules.Flag) (at time.Time, err error) {
	if f.Standing == rules.Open {
		return f.RaisedAt, nil
	}
	past, err := turns(r, f.Ref)
	at = f.RaisedAt
	for _, t := range past {
		if t.standing == rules.Open || t.standing == rules.Reopened {
			at = t.at
		}
	}
	return at, err
}

// readAt is when the first of the channels that take a flag could be read.
func readAt(teller *notify.Teller, f *rules.Flag, asked time.Time) time.Time {
	read := time.Time{}
	takers := teller.Takers(f.Kind, f.Group)
	for _, ch := range teller.Channels {
		if open := teller.Hours(ch).Opening(asked); slices.Contains(takers, ch.Name) && (read.IsZero() || open.Before(read)) {
			read = open
		}
	}
	if read.IsZero() {
		return asked
	}
	return read
}

func groupOf(c *config.Config, name string) rules.Group {
	for _, g := range c.Groups {
		if g.Name == name && name != "" {
			return g
		}
	}
	return rules.Group{}
}

// escalate does so in the daemon.
func (d *daemon) escalate(ctx context.Context, slot time.Time) error {
	s, done, err := d.turn(ctx)
	if err != nil {
		return err
	}
	defer done()
	return escalate(s.config, d.ledger, s.teller, slot)
}

package notify

import (
	"cmp"
	"slices"
	"time"

	"strayd/rules"
)

// storm is how many messages one step may send to one channel; beyond it they become one digest.
const storm = 8

// Teller makes the notices of what happened, for each channel that takes them. It keeps nothing and may be used from several
// goroutines.
type Teller struct {
	Channels []rules.Channel
	Groups   []rules.Group
	Owner    func(series string) string // of the register, "" where it names none; nil without a register
	Zone     *time.Location             // of hours and of the times in messages; nil for UTC
}

// Notices tells what one step has to tell. Flags that ask nothing of anyone make no notice. The flags of one series and date make
// one message; more than eight messages to one channel become a digest.
func (t *Teller) Notices(news rules.News) []rules.Notice {
	var out []rules.Notice
	for _, c := range t.Channels {
		out = append(out, t.reopened(c, news)...)
		events := t.events(c, news.Flags)
		if len(events) > storm {
			out = append(out, t.digest(c, news, events))
			continue
		}
		for _, e := range events {
			out = append(out, t.message(c, news, e))
		}
	}
	return t.markTold(out)
}

// Takers names the channels that take a flag of this kind and group, "" for a flag or a series without a group.
func (t *Teller) Takers(kind rules.Kind, group string) []string {
	f := rules.Flag{Kind: kind, Group: group}
	if !wholeFeed(kind) {
		f.Series = "any"
	}
	var names []string
	for _, c := range t.Channels {
		if takes(c, &f) {
			names = append(names, c.Name)
		}
	}
	return names
}

// takes says whether a channel takes a flag. One that is about neither a series nor a group concerns every channel.
func takes(c rules.Channel, f *rules.Flag) bool {
	if len(c.Kinds) > 0 && !slices.Contains(c.Kinds, f.Kind) {
		return false
	}
	return len(c.For) == 0 || f.Series == "" && f.Group == "" || slices.Contains(c.For, f.Group)
}

func wholeFeed(k rules.Kind) bool {
	return k == rules.KindMissing || k == rules.KindLate || k == rules.KindRefused
}

// event is what one message tells of: the flags of one series and date, or one flag about no series.
type event []*rules.FlagNews

// events are what a channel is told of, in the order of the news; the gravest kind of each first.
func (t *Teller) events(c rules.Channel, flags []rules.FlagNews) []event {
	type about struct {
		series string
		date   rules.Date
	}
	var out []event
	at := map[about]int{}
	markets := marketsFor(c, flags)
	for i := range flags {
		f := &flags[i]
		if !f.Standing.Asks() || !takes(c, &f.Flag) {
			continue
		}
		if f.Covered && markets[groupDay{f.Group, f.Date}] {
			continue
		}
		key := about{f.Series, f.Date}
		n, known := at[key]
		if f.Series == "" || !known {
			at[key] = len(out)
			out = append(out, event{f})
			continue
		}
		out[n] = append(out[n], f)
	}
	for n, e := range out {
		if e[0].Kind == rules.KindMarketDay {
			out[n] = append(e, coveredBy(c, e[0], flags)...)
			continue
		}
		slices.SortStableFunc(e, func(x, y *rules.FlagNews) int { return cmp.Compare(rank(x.Kind), rank(y.Kind)) })
	}
	return out
}

type groupDay struct {
	group string
	date  rules.Date
}

// marketsFor are the market days that a channel is told of.
func marketsFor(c rules.Channel, flags []rules.FlagNews) map[groupDay]bool {
	out := map[groupDay]bool{}
	for i := range flags {
		if f := &flags[i]; f.Kind == rules.KindMarketDay && f.Standing.Asks() && takes(c, &f.Flag) {
			out[groupDay{f.Group, f.Date}] = true
		}
	}
	return out
}

// coveredBy are the breaches that the message of a market day stands for.
func coveredBy(c rules.Channel, market *rules.FlagNews, flags []rules.FlagNews) (out event) {
	for i := range flags {
		f := &flags[i]
		if f.Covered && f.Group == market.Group && f.Date == market.Date && f.Standing.Asks() && takes(c, &f.Flag) {
			out = append(out, f)
		}
	}
	return out
}

// rank orders kinds from the gravest.
func rank(k rules.Kind) int { return slices.Index(rules.Kinds, k) }

// shown are the flags of an event that a line about it names: of a market day the one about the group.
func (e event) shown() event {
	if e[0].Kind == rules.KindMarketDay {
		return e[:1]
	}
	return e
}

func (e event) refs() []uint64 {
	refs := make([]uint64, len(e))
	for i, f := range e {
		refs[i] = f.Ref
	}
	return refs
}

// message is the notice of one event.
func (t *Teller) message(c rules.Channel, news rules.News, e event) rules.Notice {
	n := t.notice(c, e[0].Kind, news.At)
	n.Key, n.Refs, n.Date = eventKey(c, e), e.refs(), e[0].Date
	if c.Short {
		n.Lines = fit([]string{shortHead(e.shown())})
	} else if e[0].Kind == rules.KindMarketDay {
		n.Lines = fit(t.market(news, e, n))
	} else {
		n.Lines = fit(t.alert(news, e, n.Next))
	}
	return n
}

// notice is an empty notice to a channel, held until the channel's hours.
func (t *Teller) notice(c rules.Channel, kind rules.Kind, at time.Time) rules.Notice {
	return rules.Notice{Channel: c.Name, Kind: kind, Date: rules.NoDate, Made: at, State: rules.NoticeWaiting,
		Next: t.Hours(c).Opening(at)}
}

// Hours is when a channel takes notices.
func (t *Teller) Hours(c rules.Channel) Hours { return Hours{c.From, c.To, t.Zone} }

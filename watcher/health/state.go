package health

import (
	"encoding/json"
	"time"

	"strayd/rules"
)

// The shape of /state. Its keys are documented in the package comment.
type (
	stateJSON struct {
		Version       string            `json:"version"`
		Now           *string           `json:"now"`
		Started       *string           `json:"started"`
		Beat          *string           `json:"beat"`
		Alive         bool              `json:"alive"`
		Ready         bool              `json:"ready"`
		Healthy       bool              `json:"healthy"`
		Stopping      bool              `json:"stopping"`
		Troubles      []string          `json:"troubles"`
		Ledger        ledgerJSON        `json:"ledger"`
		Configuration configurationJSON `json:"configuration"`
		Jobs          []jobJSON         `json:"jobs"`
		Channels      []channelJSON     `json:"channels"`
		Feeds         []feedJSON        `json:"feeds"`
		LastPass      *passJSON         `json:"last_pass"`
		OpenFlags     map[string]int    `json:"open_flags"`
		ClockSteps    int               `json:"clock_steps"`
	}
	ledgerJSON struct {
		Open   bool   `json:"open"`
		Path   string `json:"path"`
		Step   uint64 `json:"step"`
		Bytes  int64  `json:"bytes"`
		Series int    `json:"series"`
	}
	configurationJSON struct {
		Valid   bool    `json:"valid"`
		Hash    *string `json:"hash"`
		Error   *string `json:"error"`
		ErrorAt *string `json:"error_at"`
	}
	jobJSON struct {
		Job          string  `json:"job"`
		LastSlot     *string `json:"last_slot"`
		Outcome      *string `json:"outcome"`
		Error        *string `json:"error"`
		NextSlot     *string `json:"next_slot"`
		RunningSince *string `json:"running_since"`
		Overdue      bool    `json:"overdue"`
		Runs         int     `json:"runs"`
		Failed       int     `json:"failed"`
		Panics       int     `json:"panics"`
		Missed       int     `json:"missed"`
		Coalesced    int     `json:"coalesced"`
	}
	channelJSON struct {
		Channel       string       `json:"channel"`
		State         ChannelState `json:"state"`
		Reason        *string      `json:"reason"`
		Waiting       int          `json:"waiting"`
		Failed        int          `json:"failed"`
		OldestWaiting *string      `json:"oldest_waiting"`
		Error         *string      `json:"error"`
		Fallback      *string      `json:"fallback"`
	}
	feedJSON struct {
		Feed string  `json:"feed"`
		File *string `json:"file"`
		Date *string `json:"date"`
		At   *string `json:"at"`
	}
	passJSON struct {
		Number   uint32         `json:"number"`
		Started  *string        `json:"started"`
		Ended    *string        `json:"ended"`
		Error    *string        `json:"error"`
		Accepted int            `json:"accepted"`
		Refused  int            `json:"refused"`
		Waiting  int            `json:"waiting"`
		Verdicts map[string]int `json:"verdicts"`
		Flags    map[string]int `json:"flags"`
	}
)

// state is the page /state.
func (l *look) state() ([]byte, error) {
	c := l.Configuration
	return json.MarshalIndent(stateJSON{
		Version: l.Version, Now: moment(l.Now), Started: moment(l.Started), Beat: moment(l.Beat),
		Alive: l.alive, Ready: l.ready(), Healthy: l.healthy(), Stopping: l.Stopping, Troubles: append([]string{}, l.troubles...),
		Ledger:        ledgerJSON(l.Ledger),
		Configuration: configurationJSON{Valid: c.Valid, Hash: text(c.Hash), Error: text(c.Error), ErrorAt: moment(c.ErrorAt)},
		Jobs:          each(l.Jobs, func(j Job) jobJSON { return j.json(l.Now) }),
		Channels:      each(l.Channels, Channel.json),
		Feeds:         each(l.Feeds, Feed.json),
		LastPass:      l.Pass.json(),
		OpenFlags:     counts(rules.Kinds, l.OpenFlags),
		ClockSteps:    l.ClockSteps,
	}, "", "  ")
}

func (j Job) json(now time.Time) jobJSON {
	return jobJSON{Job: j.Name, LastSlot: moment(j.LastSlot), Outcome: text(j.Outcome), Error: text(j.Error), NextSlot: moment(j.NextSlot),
		RunningSince: moment(j.Running), Overdue: j.overdue(now), Runs: j.Runs, Failed: j.Failed, Panics: j.Panics, Missed: j.Missed,
		Coalesced: j.Coalesced}
}

func (c Channel) json() channelJSON {
	return channelJSON{Channel: c.Name, State: c.State, Reason: text(c.Reason), Waiting: c.Waiting, Failed: c.Failed,
		OldestWaiting: moment(c.Oldest), Error: text(c.Error), Fallback: text(c.Fallback)}
}

func (f Feed) json() feedJSON {
	if f.At.IsZero() {
		return feedJSON{Feed: f.Name}
	}
	return feedJSON{Feed: f.Name, File: text(f.File), Date: text(f.Date.String()), At: moment(f.At)}
}

func (p Pass) json() *passJSON {
	if p.Number == 0 {
		return nil
	}
	return &passJSON{Number: p.Number, Started: moment(p.Started), Ended: moment(p.Ended), Error: text(p.Error), Accepted: p.Accepted,
		Refused: p.Refused, Waiting: p.Waiting, Verdicts: counts(findings(), p.Verdicts), Flags: counts(rules.Kinds, p.Flags)}
}

// findings lists every finding, in the order of how far out it is.
func findings() []rules.Finding {
	return []rules.Finding{rules.Inside, rules.Watch, rules.Breach, rules.NotJudged}
}

// counts holds every one of the words, those that did not occur with 0, so that the keys never change.
func counts[W ~string](words []W, n map[W]int) map[string]int {
	all := make(map[string]int, len(words))
	for _, w := range words {
		all[string(w)] = n[w]
	}
	return all
}

func each[A, B any](list []A, f func(A) B) []B {
	out := make([]B, len(list))
	for i, a := range list {
		out[i] = f(a)
	}
	return out
}

func moment(t time.Time) *string {
	if t.IsZero() {
		return nil
	}
	s := stamp(t)
	return &s
}

func text(s string) *string {
	if s == "" {
		return nil
	}
	return &s
}

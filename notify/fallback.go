package notify

import (
	"slices"

	"strayd/rules"
)

// When a channel is dead, or has delivered nothing for as long as its route says, its waiting notices become its fallback's: the same
// notices under the same numbers, moved in one durable step each, so that none is lost or doubled on the way. The fallback says for whom
// it stands in. What the fallback is told anyhow stays: the words about the program and the daily line, and flags that it takes itself.

// lags says whether the channel has delivered nothing for as long as its route says, or still has not since its fallback took over.
func (w *worker) lags() bool {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.Fallback != "" && (w.fallen || now().Sub(later(w.sent, w.began)) > w.After)
}

// handOver gives the fallback the waiting notices that it is to take.
func (w *worker) handOver() {
	if w.Fallback == "" {
		return
	}
	waiting, err := w.s.Outbox.Waiting(w.Name)
	if !w.stored(err) {
		return
	}
	handed := 0
	for _, n := range waiting {
		if !w.over(&n) {
			continue
		}
		n.For, n.Channel, n.Next, n.Attempts = or(n.For, w.Name), w.Fallback, now(), 0
		if !w.stored(w.s.Outbox.Mark(n)) {
			break // the next look takes the rest
		}
		handed++
		w.s.Report(Event{Channel: w.Name, Notice: n, Class: DeadChannel, Reason: n.Error, Fallback: w.Fallback})
	}
	if handed > 0 {
		w.mu.Lock()
		w.fallen = true
		w.mu.Unlock()
		w.s.Wake()
	}
}

// over says whether the fallback is to take a notice. While another one has taken over, a channel that lives tries each notice once, by
// which it is seen when it delivers again.
func (w *worker) over(n *rules.Notice) bool {
	at := now()
	if n.Told == w.Fallback || tellsAll(n.Kind) || w.Hours.Opening(at).After(at) {
		return false
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	since := later(later(w.Hours.Opening(n.Made), n.Ended), later(w.sent, w.began))
	return w.dead || w.fallen && n.Attempts > 0 || at.Sub(since) > w.After
}

// tellsAll says whether every channel is told notices of this kind by its own.
func tellsAll(k rules.Kind) bool {
	return k == rules.KindDaily || k == rules.KindNotice || k == rules.KindTest
}

// markTold notes on each notice of a step whether the channel's fallback is told of all its flags by notices of its own, or, where it
// is about no flag, of the same.
func (t *Teller) markTold(step []rules.Notice) []rules.Notice {
	refs, names := map[string][]uint64{}, map[string]bool{}
	for _, n := range step {
		refs[n.Channel], names[n.Channel] = append(refs[n.Channel], n.Refs...), true
	}
	for i := range step {
		n := &step[i]
		fallback := t.channel(n.Channel).Fallback
		if names[fallback] && !slices.ContainsFunc(n.Refs, func(r uint64) bool { return !slices.Contains(refs[fallback], r) }) {
			n.Told = fallback
		}
	}
	return step
}

func (t *Teller) channel(name string) rules.Channel {
	for _, c := range t.Channels {
		if c.Name == name {
			return c
		}
	}
	return rules.Channel{}
}

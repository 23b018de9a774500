package notify

import (
	"context"
	"errors"
	"slices"
	"time"

	"strayd/rules"
)

const (
	oldest       = 72 * time.Hour // a notice that waited longer has failed
	lateAfter    = 24 * time.Hour // an older notice says so
	backoffFirst = 2 * time.Second
	backoffMost  = 10 * time.Minute
	afterMost    = 24 * time.Hour // of a time that a service names
	oddMost      = 5              // attempts that fail for an unknown reason
	// An attempt that may have got through is repeated at the usual pace ten times, then about hourly: an outage is waited out, while
	// a service that takes each attempt and loses each answer gets few repeats.
	ambiguousMost = 10
	slowly        = 30 * time.Minute
)

// attempt takes the notice at the head of the queue one step further. It is recorded as sending before the call, so that a crash
// in between leaves a trace. The channels of one service take turns: whatever moment a crash comes at, one notice at most is in its
// hands without a recorded outcome.
func (w *worker) attempt(ctx context.Context, n rules.Notice) {
	if now().Sub(later(n.Made, n.Ended)) > oldest {
		w.finish(ctx, &n, rules.NoticeFailed, Retry, "not delivered within 72 h; last: "+or(n.Error, "never tried"))
		return
	}
	done, ok := w.s.turn(ctx, w.Service)
	if !ok {
		return
	}
	defer done()
	if !w.alive() {
		return
	}
	w.setState(Sends)
	if n.Repeat && w.arrived(ctx, &n) {
		w.finish(ctx, &n, rules.NoticeSent, "", "")
		return
	}
	n.State, n.Started = rules.NoticeSending, now()
	n.Attempts++
	if !w.stored(w.s.Outbox.Mark(n)) {
		w.nap(ctx, storeRetry)
		return
	}
	plain := w.plain == n.Number
	receipt, err := w.call(ctx, w.way(n, plain), n)
	if err == nil {
		n.Receipt = receipt
		w.finish(ctx, &n, rules.NoticeSent, "", "")
		w.attach(&n)
		return
	}
	w.failed(ctx, &n, failure(err), plain)
}

// way is how a notice is posted: as bare text when the service did not take its form, else with its picture where messages hold one.
func (w *worker) way(n rules.Notice, plain bool) func(context.Context, rules.Notice) (string, error) {
	if plain {
		return w.To.(Plainer).PostPlain
	}
	if to, ok := w.To.(Illustrator); ok {
		if p := w.picture(n); p != nil {
			return func(ctx context.Context, n rules.Notice) (string, error) { return to.PostWith(ctx, n, p) }
		}
	}
	return w.To.Post
}

// arrived asks the channel whether an earlier attempt got through.
func (w *worker) arrived(ctx context.Context, n *rules.Notice) bool {
	f, ok := w.To.(Finder)
	if !ok {
		return false
	}
	found := FoundUnknown
	find := func(ctx context.Context, n rules.Notice) (receipt string, err error) {
		found, receipt = f.Find(ctx, n)
		return receipt, nil
	}
	receipt, err := w.call(ctx, find, *n)
	switch {
	case err != nil:
		return false
	case found == FoundThere:
		n.Receipt = receipt
		return true
	}
	n.Repeat = found == FoundUnknown
	return false
}

func failure(err error) *Failure {
	var f *Failure
	if errors.As(err, &f) {
		return f
	}
	return &Failure{Class: Unknown, Reason: err.Error()}
}

// failed decides what becomes of a notice after an attempt that brought an error.
func (w *worker) failed(ctx context.Context, n *rules.Notice, f *Failure, plain bool) {
	switch f.Class {
	case DeadChannel, DeadAll:
		w.again(ctx, n, f, 0)
		w.die(f)
		return
	case BadPayload:
		if _, ok := w.To.(Plainer); ok && !plain {
			w.plain = n.Number
			w.again(ctx, n, f, 0)
			return
		}
		w.finish(ctx, n, rules.NoticeFailed, f.Class, f.Reason)
		return
	case Retry:
		if f.After > 0 {
			w.pauseFor(f)
			w.again(ctx, n, f, 0)
			return
		}
	case Ambiguous:
		n.Repeat = true
	default:
		if w.oddAgain(n.Number) >= oddMost {
			w.finish(ctx, n, rules.NoticeFailed, Unknown, f.Reason)
			return
		}
	}
	w.again(ctx, n, f, w.backoff(n.Attempts, f.Class))
}

// pauseFor holds the channel back as long as the service asked for, and a little longer, so that not all of its channels come back
// at once.
func (w *worker) pauseFor(f *Failure) {
	after := min(f.After, afterMost)
	w.pause = now().Add(after + w.s.Jitter(max(time.Second, after/10)))
}

// backoff is how long to wait after so many attempts: an even share of a span that doubles from 2 s to 10 min.
func (w *worker) backoff(attempts int, c Class) time.Duration {
	if c == Ambiguous && attempts > ambiguousMost {
		return slowly + w.s.Jitter(slowly)
	}
	span := backoffMost
	if attempts < 10 {
		span = min(span, backoffFirst<<(attempts-1))
	}
	return w.s.Jitter(span)
}

// oddAgain counts how often in a row the same notice failed for an unknown reason.
func (w *worker) oddAgain(number uint64) int {
	if w.oddOne != number {
		w.oddOne, w.odd = number, 0
	}
	w.odd++
	return w.odd
}

// again puts the notice back to the head of the queue.
func (w *worker) again(ctx context.Context, n *rules.Notice, f *Failure, wait time.Duration) {
	n.State, n.Error = rules.NoticeWaiting, cut(safe(f.Reason), lineRunes)
	n.Next = later(now().Add(wait), w.pause)
	w.record(ctx, n, f.Class)
}

// finish records that a notice is done with.
func (w *worker) finish(ctx context.Context, n *rules.Notice, s rules.NoticeState, c Class, reason string) {
	n.State, n.Ended, n.Error = s, now(), cut(safe(reason), lineRunes)
	w.record(ctx, n, c)
}

// record marks the outcome, however often that takes: an outcome that is not recorded is asked for after the next start.
func (w *worker) record(ctx context.Context, n *rules.Notice, c Class) {
	for !w.stored(w.s.Outbox.Mark(*n)) {
		if !w.nap(ctx, storeRetry) {
			return
		}
	}
	w.outcome(n, c)
	w.s.Report(Event{Channel: w.Name, Notice: *n, Class: c, Reason: n.Error})
}

// die stops the channel, and its service when that is what is dead.
func (w *worker) die(f *Failure) {
	w.stop(f.Class, f.Reason)
	w.s.Report(Event{Channel: w.Name, Class: f.Class, Reason: f.Reason, Stopped: true})
	if f.Class == DeadAll && w.Service != "" {
		w.s.stopService(w.Service, f.Reason)
	}
}

// worded is what a notice says when it is sent: its lines, and on the first whether it is late, perhaps a repeat, or another channel's.
func worded(n rules.Notice, at time.Time, zone *time.Location) []string {
	lines := slices.Clone(n.Lines)
	if len(lines) == 0 {
		lines = []string{""}
	}
	if at.Sub(n.Made) > lateAfter {
		lines[0] += " (late: of " + n.Made.In(zoneOr(zone)).Format("Mon 2006-01-02 15:04 MST") + ")"
	}
	if n.For != "" {
		lines[0] += " (for " + name(n.For) + ", which does not deliver)"
	}
	if n.Repeat {
		lines[0] += " (possible repeat)"
	}
	return lines
}

// Again is a failed or sent notice put back into the queue by a person. Its age counts from then. One that had been sent is sent
// anew, rather than found to have arrived.
func Again(n rules.Notice, at time.Time) rules.Notice {
	n.Repeat = n.Repeat && n.State != rules.NoticeSent
	n.State, n.Attempts, n.Next, n.Ended = rules.NoticeWaiting, 0, at, at
	n.Receipt, n.Error = "", ""
	return n
}

func later(a, b time.Time) time.Time {
	if b.After(a) {
		return b
	}
	return a
}

func or(s, otherwise string) string {
	if s == "" {
		return otherwise
	}
	return s
}

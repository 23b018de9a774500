package notify

import (
	"context"
	"math/rand/v2"
	"sync"
	"time"

	"strayd/rules"
)

// Route is a channel by its name.
type Route struct {
	Name    string
	Service string // what it shares its credentials with, such as "slack"; "" for nothing
	To      Channel
	Hours   Hours

	Fallback string        // the channel that takes over when this one is dead or delivers nothing, "" for none
	After    time.Duration // for how long it delivers nothing before that
}

// Sending is what a Sender is made from.
type Sending struct {
	Outbox Outbox
	Routes []Route
	Zone   *time.Location // of the date in a late notice; nil for UTC
	Grace  time.Duration  // how long a call in hand may go on after a stop; 10 s when 0

	// Picture draws what goes with a notice, nil where nothing does; nil for no pictures.
	Picture func(rules.Notice) (*Picture, error)
	// Jitter gives an even share of a span, from 0 up to but not including it; nil for a random one.
	Jitter func(time.Duration) time.Duration
	// Report is told of every outcome, from several goroutines; nil for nobody.
	Report func(Event)
}

// Event is something that became of a notice or a channel.
type Event struct {
	Channel string
	Notice  rules.Notice // Number 0 when it is about none
	Class   Class        // "" when the notice was sent
	Reason  string
	Stopped bool // the channel delivers nothing until the next start or reload

	Fallback string // the channel that the notice was handed to, "" for none
	Picture  bool   // of the notice's picture alone: its words are on their way, or there
}

// Sender delivers the outbox: one worker a channel, first in, first out. It is started once.
type Sender struct {
	Sending
	workers []*worker
	turns   map[string]chan struct{} // by service: full while one of its channels makes an attempt

	mu   sync.Mutex
	dead map[string]string // services stopped for good, with the reason
}

// NewSender prepares a sender. Run starts it.
func NewSender(o Sending) *Sender {
	if o.Grace == 0 {
		o.Grace = 10 * time.Second
	}
	if o.Jitter == nil {
		o.Jitter = rand.N[time.Duration]
	}
	if o.Report == nil {
		o.Report = func(Event) {}
	}
	s := &Sender{Sending: o, dead: map[string]string{}, turns: map[string]chan struct{}{}}
	for _, r := range o.Routes {
		if r.Service != "" && s.turns[r.Service] == nil {
			s.turns[r.Service] = make(chan struct{}, 1)
		}
		s.workers = append(s.workers, &worker{Route: r, s: s, wake: make(chan struct{}, 1), state: Idle, pictures: make(chan rules.Notice, picturesAhead)})
	}
	return s
}

// Run delivers until the context ends and the calls in hand are done or cut off. Errors of the outbox are reported and tried
// again.
func (s *Sender) Run(ctx context.Context) {
	s.failOrphans()
	var wg sync.WaitGroup
	for _, w := range s.workers {
		wg.Go(func() { w.run(ctx) })
	}
	<-ctx.Done()
	wg.Wait()
}

// Wake has every worker look at the outbox now. Without it, they look once a minute.
func (s *Sender) Wake() {
	for _, w := range s.workers {
		select {
		case w.wake <- struct{}{}:
		default: // it is awake or about to be
		}
	}
}

// failOrphans gives up the notices of channels that are no longer there, so that none waits unseen.
func (s *Sender) failOrphans() {
	known := map[string]bool{}
	for _, r := range s.Routes {
		known[r.Name] = true
	}
	var orphans []rules.Notice
	err := s.Outbox.Notices(func(n rules.Notice) bool {
		if !known[n.Channel] && (n.State == rules.NoticeWaiting || n.State == rules.NoticeSending) {
			orphans = append(orphans, n)
		}
		return true
	})
	for _, n := range orphans {
		n = orphaned(n, known[n.For])
		if e := s.Outbox.Mark(n); e != nil {
			err = e
		}
		if n.State == rules.NoticeFailed {
			s.Report(Event{Channel: n.Channel, Notice: n, Class: DeadChannel, Reason: n.Error})
		}
	}
	if err != nil {
		s.Report(Event{Class: Unknown, Reason: "outbox: " + err.Error()})
	}
}

// orphaned is a notice whose channel is gone: back in the queue of the channel it was made for where that is there, else failed.
func orphaned(n rules.Notice, returns bool) rules.Notice {
	if returns {
		n.Repeat = n.Repeat || n.State == rules.NoticeSending
		n.State, n.Channel, n.For, n.Next = rules.NoticeWaiting, n.For, "", now()
		return n
	}
	n.State, n.Ended, n.Error = rules.NoticeFailed, now(), "the configuration has no such channel any more"
	return n
}

// turn waits until no other channel of a service makes an attempt; done ends the turn. ok is false when the context ends first.
func (s *Sender) turn(ctx context.Context, service string) (done func(), ok bool) {
	turn := s.turns[service]
	if turn == nil {
		return func() {}, true
	}
	select {
	case turn <- struct{}{}:
		return func() { <-turn }, true
	case <-ctx.Done():
		return nil, false
	}
}

// stopService notes that a service refused its credentials, and wakes its channels so that they stop.
func (s *Sender) stopService(service, reason string) {
	s.mu.Lock()
	s.dead[service] = reason
	s.mu.Unlock()
	s.Wake()
}

func (s *Sender) serviceDead(service string) (reason string, dead bool) {
	s.mu.Lock()
	defer s.mu.Unlock()
	reason, dead = s.dead[service]
	return reason, dead && service != ""
}

// now is the time on the wall clock alone: a timer's clock stands still while the machine sleeps.
func now() time.Time { return time.Now().Round(0) }

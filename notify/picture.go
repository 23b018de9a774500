package notify

import (
	"context"
	"fmt"
	"time"

	"strayd/rules"
)

// Picture goes with a notice where the channel takes one. The words of a notice never wait for it, and never fail for it.
type Picture struct {
	Name string // of its file
	PNG  []byte
	Text string // what it shows, for who does not see it
}

// Illustrator is a channel whose messages can hold a picture.
type Illustrator interface {
	PostWith(ctx context.Context, n rules.Notice, p *Picture) (receipt string, err error)
}

// Attacher is a channel that takes a picture after its message, which the notice's receipt names.
type Attacher interface {
	Attach(ctx context.Context, n rules.Notice, p *Picture) error
}

const (
	pictureMost   = 20 * time.Second // for one picture, the drawing apart
	picturesAhead = 64               // that may wait; a picture more is left out
)

// picture draws what goes with a notice, nil where nothing does. What goes wrong is reported, and costs the picture alone.
func (w *worker) picture(n rules.Notice) (p *Picture) {
	if w.s.Picture == nil {
		return nil
	}
	defer func() {
		if r := recover(); r != nil {
			w.unpictured(n, &Failure{Class: Unknown, Reason: fmt.Sprintf("panic: %v", r)})
			p = nil
		}
	}()
	p, err := w.s.Picture(n)
	if err != nil {
		w.unpictured(n, failure(err))
		return nil
	}
	return p
}

func (w *worker) unpictured(n rules.Notice, f *Failure) {
	w.s.Report(Event{Channel: w.Name, Notice: n, Class: f.Class, Reason: cut(safe(f.Reason), lineRunes), Picture: true})
}

// attachable says whether a notice that was sent may have a picture attached. One that may have arrived twice has none: it must not have
// two.
func (w *worker) attachable(n *rules.Notice) bool {
	_, ok := w.To.(Attacher)
	return ok && w.s.Picture != nil && !n.Repeat && n.State == rules.NoticeSent && n.Receipt != ""
}

// attach leaves a sent notice to the one who attaches pictures.
func (w *worker) attach(n *rules.Notice) {
	if !w.attachable(n) {
		return
	}
	select {
	case w.pictures <- *n:
	default:
		w.unpictured(*n, &Failure{Class: Retry, Reason: fmt.Sprintf("%d pictures wait already", picturesAhead)})
	}
}

// attaching attaches pictures one after the other, beside the sending of notices, until there are no more to come. Each is tried once.
// A service that asks for patience gets no picture meanwhile, one that refuses them gets none until the next start.
func (w *worker) attaching(ctx context.Context) {
	ctx, cancel := w.grace(ctx)
	defer cancel()
	var bare time.Time // no picture before
	for n := range w.pictures {
		switch {
		case ctx.Err() != nil, now().Before(bare):
			continue
		}
		p := w.picture(n)
		if p == nil {
			continue
		}
		err := w.attachOne(ctx, n, p)
		if err != nil {
			f := failure(err)
			w.unpictured(n, f)
			bare = now().Add(min(f.After, afterMost))
			if f.Class == DeadAll || f.Class == DeadChannel {
				bare = now().AddDate(100, 0, 0)
			}
		}
		w.rest(ctx)
	}
}

func (w *worker) attachOne(ctx context.Context, n rules.Notice, p *Picture) (err error) {
	ctx, cancel := context.WithTimeout(ctx, pictureMost)
	defer cancel()
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("panic: %v", r)
		}
	}()
	return w.To.(Attacher).Attach(ctx, n, p)
}

// rest keeps the channel's pace between two pictures.
func (w *worker) rest(ctx context.Context) {
	p, ok := w.To.(Pacer)
	if !ok {
		return
	}
	timer := time.NewTimer(p.Pace())
	defer timer.Stop()
	select {
	case <-ctx.Done():
	case <-timer.C:
	}
}

// grace is a context that goes on for a while after another one has ended.
func (w *worker) grace(ctx context.Context) (context.Context, context.CancelFunc) {
	inner, cancel := context.WithCancel(context.WithoutCancel(ctx))
	stop := context.AfterFunc(ctx, func() { time.AfterFunc(w.s.Grace, cancel) })
	return inner, func() { stop(); cancel() }
}

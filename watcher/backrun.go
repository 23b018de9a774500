package watcher

import (
	"context"
	"slices"
	"sync"
	"time"

	"strayd/rules"
	"strayd/rules/backrun"
)

// BackRun is under which settings a past is judged again.
type BackRun struct {
	Settings rules.Settings
	From     rules.Date // dates before it are judged too, and not counted
	Now      time.Time
	Workers  int                                  // goroutines that judge; 0 for one a processor
	Progress func(work string, done, total int64) // nil: not told
}

// Judge judges the whole past with the code of a pass, as one first load into a ledger that holds nothing. Each value is judged before the
// windows take it; what was decided of it they take as decided, from its own date on.
func (p *Past) Judge(ctx context.Context, r BackRun) (*backrun.Side, error) {
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	s := r.Settings
	s.Ranges = slices.Clone(s.Ranges)
	if unresolved(&s) {
		resolveBudgets(&s, p.recorded, p.Series)
	}
	store := numbered(&s, len(p.terms) > 0)
	pass := &Pass{Store: store, Settings: s, Now: r.Now, Workers: r.Workers, Progress: r.Progress, again: &p.weighed, stopped: ctx.Err}
	j := &judging{names: p.names, newest: p.last(), now: r.Now, step: 1, nextRef: 1, decidedOn: p.decided}
	if err := pass.prepare(j, store); err != nil {
		return nil, err
	}
	from, _ := slices.BinarySearch(p.Dates, r.From)
	var err error
	if j.back, err = newBackCount(&s, p.Dates[from:]); err != nil {
		return nil, err
	}
	b := &Batch{Step: 1}
	outs, err := pass.judgeAll(j, p.blocks(), b)
	if err != nil {
		return nil, err
	}
	pass.assemble(b, j, outs)
	side := j.back.side(&s)
	for _, f := range b.Flags {
		if f.New && f.Date >= r.From {
			side.Flags = append(side.Flags, f.Flag)
		}
	}
	return side, nil
}

// unresolved says that a line is stated as a budget and not turned into a level yet: settings of the record are.
func unresolved(s *rules.Settings) bool {
	return slices.ContainsFunc(s.Ranges, func(r rules.Range) bool {
		return r.Watch.Budget > 0 && r.Watch.Level == 0 || r.Breach.Budget > 0 && r.Breach.Level == 0
	})
}

func (p *Past) last() rules.Date {
	if len(p.Dates) == 0 {
		return rules.NoDate
	}
	return p.Dates[len(p.Dates)-1]
}

// weighedOnce is what a pool said of a past: the next back-run takes it up where it would say the same, since lines change nothing about it.
type weighedOnce struct {
	said      *weighed
	doubtful  float64
	residuals bool // are there
}

func (o *weighedOnce) weighs(c *crew, j *judging, doubtful float64) *weighed {
	if o == nil || o.said == nil || o.doubtful != doubtful || j.ofResiduals() && !o.residuals || !o.said.crew.same(c) {
		return nil
	}
	return o.said
}

func (o *weighedOnce) keep(said *weighed, j *judging, doubtful float64) {
	if o != nil && said != nil {
		o.said, o.doubtful, o.residuals = said, doubtful, j.ofResiduals()
	}
}

// backCount gathers what the workers of a back-run count.
type backCount struct {
	dates  []rules.Date
	gauges []*rules.Gauge // by range: with the inner line at which coverage is counted; nil for limits
	widest float64        // every tail below it is seen, whatever the range

	mu     sync.Mutex
	covers []rules.Cover
	tails  []backrun.Tail
}

func newBackCount(s *rules.Settings, dates []rules.Date) (*backCount, error) {
	b := &backCount{dates: dates, widest: rules.CoverShare}
	c := coverSettings(s)
	for _, r := range c.Ranges {
		if r.Limit != nil {
			b.gauges = append(b.gauges, nil)
			continue
		}
		g, err := rules.NewGauge(r)
		if err != nil {
			return nil, err
		}
		b.gauges = append(b.gauges, g)
		if f, ok := g.Forms(r.Watch); ok {
			b.widest = min(b.widest, f.Tail)
		}
	}
	return b, nil
}

// workerCount is what one worker of a back-run counts.
type workerCount struct {
	*coverCount
	widest float64
	tails  []backrun.Tail
	daily  []int64 // scratch
}

// of has a worker count. Its lanes then look at every value beyond the line at which coverage is counted, whatever their own inner line.
func (b *backCount) of(w *worker) *workerCount {
	c := &workerCount{coverCount: newCoverCount(w.lanes, b.dates, w.j.width), widest: b.widest, daily: make([]int64, w.j.width)}
	for k, l := range w.lanes {
		g := b.gauges[l.index]
		own, share := c.shares[k], 0.0
		if f, ok := g.Forms(g.Range.Watch); ok {
			share = f.Tail
		}
		if c.shares[k] = share; share > own {
			l.gate, _ = g.Gate(w.j.members.Groupless())
		}
	}
	return c
}

// join takes what a worker counted.
func (b *backCount) join(c *workerCount) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.covers = append(b.covers, c.all(len(c.dates))...)
	b.tails = append(b.tails, c.tails...)
}

// side puts together what all workers counted.
func (b *backCount) side(s *rules.Settings) *backrun.Side {
	out := &backrun.Side{Settings: *s, Widest: b.widest, Tails: b.tails}
	out.SortTails()
	for _, r := range s.Ranges {
		byGroup := map[string][]rules.Cover{}
		var groups []string
		for _, c := range b.covers {
			if c.Range != r.Name {
				continue
			}
			if byGroup[c.Group] == nil {
				groups = append(groups, c.Group)
			}
			byGroup[c.Group] = append(byGroup[c.Group], c)
		}
		slices.Sort(groups)
		for _, g := range groups {
			c := rules.Pool(byGroup[g])
			c.Group = g
			out.Covers = append(out.Covers, c)
		}
	}
	return out
}

// countDate counts the verdicts of a date.
func (w *worker) countDate(t task, date rules.Date) {
	c := w.count
	n, ok := slices.BinarySearch(c.dates, date)
	if !ok {
		return
	}
	for k, l := range w.lanes {
		vals := c.daily[:t.width]
		_, now := w.values(t, l)
		copy(vals, now)
		for i := range w.hits {
			if h := &w.hits[i]; h.days > 1 { // a promise is about daily values
				vals[h.at] = Missing64
			}
		}
		c.judgedValues(k, l, n, vals)
		for m := range w.hits {
			h := &w.hits[m]
			if i := int(h.at); vals[i] != Missing64 && l.judges(i) && !c.tracks[k][i].unjudged {
				c.concluded(k, i, n, &h.verdicts[k])
			}
		}
	}
	w.countTails(t, n)
}

// countTails notes the smallest tail of each value that may be flagged by a line.
func (w *worker) countTails(t task, n int) {
	c := w.count
	for m := range w.hits {
		h := &w.hits[m]
		if k := smallest(h.verdicts); k >= 0 && !h.taken && h.verdicts[k].Tail.V < c.widest {
			c.tails = append(c.tails, backrun.Tail{Level: h.verdicts[k].Tail.V, Date: n, Series: t.series(int(h.at)),
				Always: h.view != nil && h.view.Kind != "", Breach: worst(h.verdicts) >= 0})
		}
	}
}

// smallest is the verdict with the smallest tail, -1 where none has one.
func smallest(verdicts []rules.Verdict) int {
	at := -1
	for k := range verdicts {
		v := &verdicts[k]
		if v.Tail.OK && v.Finding != rules.NotJudged && (at < 0 || v.Log10.V < verdicts[at].Log10.V) {
			at = k
		}
	}
	return at
}

// decidedHits makes hits of the values of a date of which somebody decided something before the back-run.
func (w *worker) decidedHits(t task, date rules.Date, fresh []int64) {
	for _, d := range w.j.decidedOn[date] {
		i := int(d.series) - int(t.series(0))
		if i >= 0 && i < t.width && fresh[i] != Missing64 {
			w.hitAt(int32(i), true).decided = d.act
		}
	}
}

// decidedNow tells the pool what was decided of the values of a date.
func (l *leader) decidedNow(date rules.Date) {
	for _, d := range l.j.decidedOn[date] {
		if m, ok := l.crew.at[d.series]; ok && l.values[m] != rules.Missing {
			l.know(known(int(m), d.act, l.values[m]))
		}
	}
}

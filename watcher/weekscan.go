package watcher

import (
	"context"
	"slices"

	"strayd/rules"
)

// scanSlack is how many dates beyond CoverDates are judged, so that a series with a few holes still has enough.
const scanSlack = 50

// weekScan judges the dates up to the end of a week once more, under given settings, and counts what is beyond which line. Values and used
// values are those of the view; the lines are those of the settings, whatever they were when a date was judged first.
type weekScan struct {
	worker
	*coverCount
	week     rules.Date // the Monday
	settings *rules.Settings
	thin     rules.Thin
	progress func(done, total int64)
	ctx      context.Context
}

// scanCover counts every series under every estimated range for the CoverDates dates up to a week's end.
func scanCover(ctx context.Context, v View, names *Names, s *rules.Settings, monday rules.Date, progress func(done, total int64)) (*weekScan, error) {
	w := &weekScan{week: monday, progress: progress, ctx: ctx, settings: s}
	p := &Pass{Settings: coverSettings(s)}
	j := &judging{names: names, heldNames: names.Len(), step: v.Step()}
	if err := p.prepare(j, v); err != nil {
		return nil, err
	}
	j.scales = newGroupScales(j, v, nil)
	w.worker = *newWorker(j, v)
	end, _ := slices.BinarySearch(j.held, monday+7)
	w.coverCount = newCoverCount(w.lanes, j.held[max(0, end-rules.CoverDates-scanSlack):end], j.width)
	todo := tasks(allBlocks(names.Len(), rules.NoDate), j.width)
	for n, t := range todo {
		if err := w.task(t); err != nil {
			return nil, err
		}
		if progress != nil {
			progress(int64(n+1), int64(len(todo)))
		}
	}
	return w, nil
}

// coverSettings puts the inner line of every range at CoverShare, where the range can speak of so small a share.
func coverSettings(s *rules.Settings) rules.Settings {
	c := *s
	c.Ranges = slices.Clone(s.Ranges)
	for n, r := range c.Ranges {
		if r.Limit != nil {
			continue
		}
		r.Watch = rules.Line{Tail: rules.CoverShare}
		if _, err := rules.NewGauge(r); err == nil && (r.Tail.Name != "rank" || r.Window+1 >= 2/rules.CoverShare) {
			c.Ranges[n] = r
		}
	}
	return c
}

func (w *weekScan) task(t task) error {
	if err := w.ctx.Err(); err != nil || len(w.dates) == 0 {
		return err
	}
	w.begin(t)
	if err := w.loadPlain(t, w.dates[0]); err != nil {
		return err
	}
	w.open(t, w.group)
	week := newWeekValues(t.width)
	for n, date := range w.dates {
		ok, err := w.view.Fill(Returns, date, t.block, t.from, w.raw[:t.width])
		if err != nil {
			return err
		}
		if !ok {
			continue
		}
		if date >= w.week {
			week.take(w.raw[:t.width])
		}
		if err := w.j.withoutSpans(w.view, date, t.block, t.from, w.raw[:t.width]); err != nil { // a promise is about daily values
			return err
		}
		for k, l := range w.lanes {
			if err := w.scan(t, k, l, n); err != nil {
				return err
			}
		}
	}
	w.fold(t, w.j.names, rules.CoverDates)
	w.foldThin(t, week)
	return nil
}

// loadPlain brings every lane to its state before a date, and does not ask why a window is empty.
func (w *weekScan) loadPlain(t task, before rules.Date) error {
	held := w.j.heldBefore(t.block, before)
	var back []*backward
	for _, l := range w.lanes {
		l.reset()
		if p, ok := l.windows.(loader); ok {
			back = append(back, newBackward(l, p, before, t.width))
		} else if err := w.loadForward(t, l, held, before); err != nil {
			return err
		}
	}
	return w.loadBack(t, back, held)
}

// scan judges one date under one lane and lets its windows take it.
func (w *weekScan) scan(t task, k int, l *lane, n int) error {
	date := w.dates[n]
	raw, err := w.judgedOn(t, l, date)
	if err != nil {
		return err
	}
	l.rest(date, raw)
	w.cand = l.candidates(raw, w.cand[:0])
	w.judgedValues(k, l, n, raw)
	for _, at := range w.cand {
		i := int(at)
		if raw[i] == Missing64 || !l.judges(i) || w.tracks[k][i].unjudged {
			continue
		}
		past := l.past(i)
		if past.N < rules.LeastNormal {
			past.Group = w.j.scales.lent(l, w.group(i), date)
		}
		past.DF = w.j.scales.learnt(l, w.group(i), date)
		v := l.gauge.Judge(rules.Units(raw[i]), past)
		w.concluded(k, i, n, &v)
	}
	used, err := w.usedOf(t, l, date)
	if err == nil {
		l.push(date, used)
	}
	return err
}

// judgedOn are the values of a date that a lane judges: the returns, which stand in raw, or their residuals.
func (w *weekScan) judgedOn(t task, l *lane, date rules.Date) ([]int64, error) {
	if !l.residual {
		return w.raw[:t.width], nil
	}
	now := w.residuals.now[:t.width]
	fillMissing(now)
	return now, w.view.Patch(w.j.residuals, date, t.block, t.from, now)
}

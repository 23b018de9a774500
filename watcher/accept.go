package watcher

import (
	"cmp"
	"errors"
	"runtime"
	"slices"
	"sync"
	"sync/atomic"

	"strayd/rules"
)

// accept judges a validated file and publishes it as one step.
func (p *Pass) accept(sheet *Sheet, f rules.Feed, c Candidate) error {
	if err := p.release.admits(sheet.File); err != nil {
		return err
	}
	if err := p.settle(sheet.Names.Len()); err != nil {
		return err
	}
	j, err := p.judging(sheet)
	if err != nil {
		return err
	}
	if p.Resident != nil {
		j.kept = p.Resident.begin(j.step-1, j.width)
	}
	b := &Batch{Step: j.step}
	blocks, err := p.changes(j, sheet, b)
	if err != nil {
		return err
	}
	missing, err := p.gate(j, f, sheet, blocks)
	if err != nil {
		return err
	}
	p.newest = j.newest
	out, err := p.judgeAll(j, blocks, b)
	if err != nil {
		return err
	}
	b.File = FileRow{Step: b.Step, File: sheet.File, Stamp: c.Stamp, FeedKey: p.FeedKey(f), Settings: j.settings, Outcome: Accepted,
		Received: p.Now, First: sheet.First(), Last: sheet.Last()}
	if sheet.Unended {
		b.File.Reason = unended
	}
	b.Flags = append(b.Flags, missing...)
	p.assemble(b, j, out)
	b.File.Counts.Rows = sheet.Rows
	// A price may change two returns, so that more changes than there are rows.
	b.File.Counts.Same = max(0, sheet.Rows-b.File.Counts.New-b.File.Counts.Late-b.File.Counts.Restated)
	p.tell(b, newestSeries(sheet))
	if err := p.release.into(p, b); err != nil {
		return err
	}
	b.Spend = true
	if err := p.Store.Publish(b); err != nil {
		return err
	}
	p.Resident.end(b.Step, j.keptNow)
	p.noteTaken(b.File)
	p.row.Accepted++
	p.row.Counts.Add(b.File.Counts)
	p.report(FileReport{Feed: f.Name, Name: c.Name, Fate: FateAccepted, Row: b.File, Notes: sheet.Notes})
	return nil
}

// judging prepares what the workers of one file share.
func (p *Pass) judging(sheet *Sheet) (*judging, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	j := &judging{names: sheet.Names, heldNames: sheet.Held, firstNames: p.firstNames, file: sheet.File, now: p.Now, step: v.Step() + 1, nextRef: v.NextRef()}
	j.newest = max(sheet.Last(), p.newest)
	return j, p.prepare(j, v)
}

// prepare reads the recorded settings and the dates held.
func (p *Pass) prepare(j *judging, v View) (err error) {
	if j.settings, err = v.LastSettings(); err != nil {
		return err
	}
	if j.held, err = v.Dates(Returns); err != nil {
		return err
	}
	if j.members, err = rules.NewMembership(&p.Settings); err != nil {
		return err
	}
	if len(p.Settings.Calendars) > 0 {
		j.days = p.Settings.CalendarFor
	}
	ids, err := rangeIDs(v)
	if err != nil {
		return err
	}
	for n, r := range p.Settings.Ranges {
		g, err := rules.NewGauge(r)
		if err != nil {
			return err
		}
		j.gauges = append(j.gauges, g)
		j.ids = append(j.ids, ids[p.Settings.Identity(n)])
		if r.Limit != nil {
			j.limits = append(j.limits, n)
		}
	}
	j.concluded, j.residuals, j.terms = ids[concludedKey], ids[residualKey], ids[termsKey]
	j.width = p.taskWidth(j.names.Len())
	return nil
}

// ringMemory bounds the windows that one worker holds, in bytes.
const ringMemory = 32 << 20

// taskWidth is how many series a task covers: few enough that every worker gets some, and that the windows fit the memory.
func (p *Pass) taskWidth(series int) int {
	longest := 1
	lanes := 0
	for _, r := range p.Settings.Ranges {
		if r.Limit == nil {
			longest = max(longest, r.Window)
			lanes++
		}
	}
	width := min(BlockSize, max(64, (series+2*p.workers()-1)/(2*p.workers())))
	return max(16, min(width, ringMemory/(8*longest*max(lanes, 1))))
}

func (p *Pass) workers() int {
	if p.Workers > 0 {
		return p.Workers
	}
	return runtime.GOMAXPROCS(0)
}

// block is the changed days of one block.
type block struct {
	number uint32
	series int // how many series of the block exist
	days   []*day
	since  rules.Date // replay from here even where nothing changed; NoDate for the first day
}

// tasks cuts blocks into runs of series.
func tasks(blocks []block, width int) (out []task) {
	for _, b := range blocks {
		for from := 0; from < b.series; from += width {
			out = append(out, task{block: b.number, from: from, width: min(width, b.series-from), days: b.days, since: b.since})
		}
	}
	return out
}

// judgeAll runs the tasks of all changed blocks, and notes what the groups lent.
func (p *Pass) judgeAll(j *judging, blocks []block, b *Batch) ([]outcome, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	j.scales = newGroupScales(j, v, blocks)
	if j.weighed, err = p.weigh(j, v, blocks); err != nil {
		return nil, err
	}
	if j.weighed != nil {
		concluded, err := j.conclusions(v)
		if err != nil {
			return nil, err
		}
		b.Used = append(b.Used, concluded...)
		blocks = j.replays(blocks, concluded)
		if b.Flags, err = j.marketFlags(v); err != nil {
			return nil, err
		}
	}
	outs, err := p.runTasks(j, tasks(blocks, j.width))
	if err != nil {
		return nil, err
	}
	b.Scales, err = j.scales.stored()
	return outs, err
}

func (p *Pass) runTasks(j *judging, todo []task) ([]outcome, error) {
	outs := make([]outcome, len(todo))
	errs := make([]error, min(p.workers(), max(1, len(todo))))
	panics := make([]any, len(errs))
	progress := p.progress("judging")
	var next, done atomic.Int64
	var wg sync.WaitGroup
	for n := range errs {
		wg.Go(func() {
			defer func() { panics[n] = recover() }()
			errs[n] = p.work(j, todo, outs, &next, &done, progress)
		})
	}
	wg.Wait()
	for _, value := range panics {
		if value != nil { // it goes on where whoever runs the pass can catch it
			panic(value)
		}
	}
	return outs, errors.Join(errs...)
}

// work is one worker: it takes the next task until there is none.
func (p *Pass) work(j *judging, todo []task, outs []outcome, next, done *atomic.Int64, progress Progress) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	defer v.Close()
	w := newWorker(j, v)
	defer func() {
		j.keeping.Lock()
		defer j.keeping.Unlock()
		j.keptNow = append(j.keptNow, w.keptNow...)
		if w.count != nil {
			j.back.join(w.count)
		}
	}()
	for {
		n := int(next.Add(1)) - 1
		if n >= len(todo) {
			return nil
		}
		if p.stopped != nil && p.stopped() != nil {
			return p.stopped()
		}
		if outs[n], err = w.run(todo[n]); err != nil {
			next.Store(int64(len(todo))) // the others need not go on
			return err
		}
		if d := done.Add(1); progress != nil {
			progress(d, int64(len(todo)))
		}
	}
}

// assemble puts the workers' outcomes into the batch, in an order that does not depend on who did what when.
func (p *Pass) assemble(b *Batch, j *judging, outs []outcome) {
	var states []partState
	flags, used := 0, 0
	for _, o := range outs {
		flags, used = flags+len(o.flags), used+len(o.used)
	}
	b.Flags, b.Used = slices.Grow(b.Flags, flags), slices.Grow(b.Used, used)
	for _, o := range outs {
		b.File.Counts.Add(o.counts)
		b.Flags = append(b.Flags, o.flags...)
		b.Used = append(b.Used, o.used...)
		states = append(states, o.states...)
	}
	b.Used = joinUsed(b.Used)
	b.States = joinStates(states)
	for n := range b.States {
		b.States[n].Step = b.Step
	}
	for id := j.heldNames; id < j.names.Len(); id++ {
		b.NewNames = append(b.NewNames, j.names.Name(uint32(id)))
	}
	p.numberFlags(b, j)
}

// joinUsed sorts used columns by range, date and block, and joins the parts of one block.
func joinUsed(used []UsedColumn) []UsedColumn {
	slices.SortFunc(used, func(a, b UsedColumn) int {
		return cmp.Or(cmp.Compare(a.Range, b.Range), cmp.Compare(a.Date, b.Date), cmp.Compare(a.Block, b.Block), cmp.Compare(a.Offsets[0], b.Offsets[0]))
	})
	out := used[:0]
	for _, u := range used {
		if n := len(out) - 1; n >= 0 && out[n].Range == u.Range && out[n].Date == u.Date && out[n].Block == u.Block {
			out[n] = out[n].with(u)
			continue
		}
		out = append(out, u)
	}
	return out
}

// with joins two parts of a column, whose cells may lie between each other.
func (u UsedColumn) with(o UsedColumn) UsedColumn {
	if len(u.Offsets) == 0 || u.Offsets[len(u.Offsets)-1] < o.Offsets[0] {
		u.Offsets, u.Values = append(u.Offsets, o.Offsets...), append(u.Values, o.Values...)
		return u
	}
	joined := UsedColumn{Range: u.Range, Date: u.Date, Block: u.Block}
	for i, k := 0, 0; i < len(u.Offsets) || k < len(o.Offsets); {
		if k == len(o.Offsets) || i < len(u.Offsets) && u.Offsets[i] < o.Offsets[k] {
			joined.Offsets, joined.Values = append(joined.Offsets, u.Offsets[i]), append(joined.Values, u.Values[i])
			i++
		} else {
			joined.Offsets, joined.Values = append(joined.Offsets, o.Offsets[k]), append(joined.Values, o.Values[k])
			k++
		}
	}
	return joined
}

// numberFlags orders the flags by date, series and kind, gives the new ones their refs, and turns flags of a first load into
// history once a newer date has come in within the same pass.
func (p *Pass) numberFlags(b *Batch, j *judging) {
	slices.SortFunc(b.Flags, func(x, y *FlagRow) int {
		return cmp.Or(cmp.Compare(x.Date, y.Date), cmp.Compare(x.SeriesID, y.SeriesID), cmp.Compare(x.Kind, y.Kind), cmp.Compare(x.Group, y.Group))
	})
	ref := j.nextRef
	for _, f := range b.Flags {
		if f.Step == 0 {
			f.Step = b.Step
		}
		if f.New {
			f.Ref = ref
			ref++
			b.File.Counts.Flags++
		}
	}
	p.age(b, j.newest)
	for _, f := range b.Flags {
		if f.New && f.Standing == rules.Open && f.First {
			p.opened = append(p.opened, f)
		}
	}
}

// age turns the flags of first loads on dates before the newest into history.
func (p *Pass) age(b *Batch, newest rules.Date) {
	again := map[uint64]*FlagRow{} // rows of this batch that replace an earlier one
	for _, f := range b.Flags {
		if !f.New {
			again[f.Ref] = f
		}
	}
	kept := p.opened[:0]
	for _, f := range p.opened {
		if f.Date >= newest {
			if now := again[f.Ref]; now != nil {
				f = now
			}
			kept = append(kept, f)
			continue
		}
		if now := again[f.Ref]; now != nil {
			now.Standing = rules.OfHistory
		} else {
			f.Standing, f.New = rules.OfHistory, false
			b.Flags = append(b.Flags, f)
		}
		b.Withdraw = append(b.Withdraw, f.Ref)
	}
	p.opened = kept
}

package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// concludedKey names what the ledger keeps of the pool's conclusions, as a range of its own: for every value that its windows do not take
// as it is, the use.
const concludedKey = "conclusions"

// weighed is what was said of the values that a file changes. It is only read while values are judged.
type weighed struct {
	crew *crew
	days map[rules.Date]*weighedDay
	uses map[rules.Date]map[int]causes.Use // by date and member: how the pool takes values, see conclude
}

// weighedDay is a date on which a file changes the value of a member.
type weighedDay struct {
	*causes.Result
	fresh     []bool  // by member: judged now
	residuals []int64 // by member, Missing64 where there is none; nil where no range judges them
	woken     []bool  // by member: judged now although the file does not change it; nil for none
}

// view is what was said of a member on a date, nil for nothing.
func (d *weighedDay) view(member int32) *causes.View {
	n, ok := slices.BinarySearchFunc(d.Views, int(member), func(v causes.View, m int) int { return cmp.Compare(v.Member, m) })
	if !ok {
		return nil
	}
	return &d.Views[n]
}

// leader leads a pool through the dates, from the ledger and a file on top of it.
type leader struct {
	crew *crew
	pool weigher
	upto rules.Date // the newest date that it went through
	// The pool as it stood before that date, and how far it had come: for another file of the date. nil for none.
	behind     weigher
	behindUpto rules.Date

	j        *judging
	view     View
	progress Progress          // nil: not told
	stopped  func() error      // nil: nobody can stop it
	released bool              // a person released the file
	blocks   map[uint32][]*day // what the file changes

	raw    []int64 // of one block
	values []rules.Units
	fresh  []bool
	woken  []bool
	first  []bool // the ledger has no value
	known  []causes.Known
}

// weigh leads the pool up to the newest date that a file changes for a member. The one of the file before goes on where the ledger holds
// nothing that it has not seen; else one is made anew and led through the dates on which its state depends.
func (p *Pass) weigh(j *judging, v View, blocks []block) (*weighed, error) {
	crew := newCrew(j.names, j.members, &p.Settings)
	j.crew, j.doubts = crew, p.Settings.Doubtful > 0
	j.lone = p.newWeigher == nil && (crew == nil || len(crew.series) < j.names.Len())
	if crew == nil {
		return nil, nil
	}
	if w := p.again.weighs(crew, j, p.Settings.Doubtful); w != nil {
		return w, nil
	}
	l := newLeader(crew, j, v)
	l.progress, l.stopped = p.progress("weighing"), p.stopped
	l.released = p.Released[j.file.SHA256]
	for _, b := range blocks {
		if _, ok := slices.BinarySearch(crew.blocks, b.number); ok {
			l.blocks[b.number] = b.days
		}
	}
	todo, err := l.changed()
	if err != nil || len(todo) == 0 {
		return nil, err
	}
	if pool, upto := p.led.goesOn(l, todo[0]); pool != nil {
		l.pool, l.upto = pool, upto
	} else {
		make := p.newWeigher
		if make == nil {
			make = newPool
		}
		l.pool = make(crew.members, crew.groups, p.Settings.Doubtful)
		if err := l.warm(todo[0]); err != nil {
			return nil, err
		}
	}
	out, err := l.lead(todo)
	if p.led = l; err != nil {
		p.led = nil
	}
	p.again.keep(out, j, p.Settings.Doubtful)
	return out, err
}

func newLeader(c *crew, j *judging, v View) *leader {
	n := len(c.members)
	return &leader{crew: c, j: j, view: v, blocks: map[uint32][]*day{}, upto: rules.NoDate, raw: make([]int64, BlockSize),
		values: make([]rules.Units, n), fresh: make([]bool, n), woken: make([]bool, n), first: make([]bool, n)}
}

// goesOn gives the pool of a leader of a step before, as it stands right before a date, and how far it has come; nil where there is none.
func (l *leader) goesOn(next *leader, date rules.Date) (weigher, rules.Date) {
	if l == nil || !l.crew.same(next.crew) || !valueless(next.view, l.j.step+1, next.j.step) {
		return nil, rules.NoDate
	}
	before := func(upto rules.Date) bool {
		n, _ := slices.BinarySearch(next.j.held, upto+1)
		return upto < date && (n == len(next.j.held) || next.j.held[n] >= date)
	}
	switch {
	case before(l.upto):
		return l.pool, l.upto
	case l.behind != nil && before(l.behindUpto):
		return l.behind, l.behindUpto
	}
	return nil, rules.NoDate
}

// valueless says that no step from one to before another changed a value or the settings: they tell of refused and late files, and of weeks.
func valueless(v View, from, before uint32) bool {
	for s := from; s < before; s++ {
		if row, err := v.File(s); err != nil || row.Outcome != Refused && row.Outcome != Overdue && row.Outcome != Checked {
			return false
		}
	}
	return true
}

// mostBehind is how many members a pool has at most that is copied before the newest date.
const mostBehind = 5000

// keepBehind copies the pool before it goes through the newest date, of which another feed's file may come.
func (l *leader) keepBehind() {
	if p, ok := l.pool.(*causes.Pool); ok && len(l.crew.members) <= mostBehind {
		l.behind, l.behindUpto = p.Clone(), l.upto
	}
}

// changed lists the dates on which the file changes the value of a member, ascending.
func (l *leader) changed() (out []rules.Date, err error) {
	for _, number := range l.crew.blocks {
		from, to := l.crew.in(task{block: number, width: BlockSize})
		for _, d := range l.blocks[number] {
			if d.col == nil {
				continue
			}
			for m := from; m < to; m++ {
				if at := int(l.crew.series[m] % BlockSize); at < d.col.Len() && d.col.has(at) {
					out = append(out, d.date)
					break
				}
			}
		}
	}
	slices.Sort(out)
	return slices.Compact(out), nil
}

// warm leads a new pool through the newest dates before one, as many as its state depends on.
func (l *leader) warm(before rules.Date) error {
	n, _ := slices.BinarySearch(l.j.held, before)
	var dates []rules.Date
	for n--; n >= 0 && len(dates) < causes.Memory; n-- {
		if any, err := l.fill(l.j.held[n]); err != nil {
			return err
		} else if any {
			dates = append(dates, l.j.held[n])
		}
	}
	slices.Reverse(dates)
	for _, d := range dates {
		if _, err := l.step(d); err != nil {
			return err
		}
	}
	return nil
}

// foreseeAll leads a pool through everything held, for the residuals of ranges that are new; nil where there is none of these.
func (p *Pass) foreseeAll(j *judging, v View) (*weighed, error) {
	any := false
	for n, g := range j.gauges {
		any = any || j.ids[n] != 0 && g.Range.Of == rules.Residual && g.Range.Limit == nil
	}
	crew := newCrew(j.names, j.members, &p.Settings)
	if !any || crew == nil {
		return nil, nil
	}
	l := newLeader(crew, j, v)
	l.pool = newPool(crew.members, crew.groups, p.Settings.Doubtful)
	if p.newWeigher != nil {
		l.pool = p.newWeigher(crew.members, crew.groups, p.Settings.Doubtful)
	}
	out := &weighed{crew: crew, days: make(map[rules.Date]*weighedDay, len(j.held))}
	for _, d := range j.held {
		r, err := l.step(d)
		if err != nil {
			return nil, err
		}
		if r != nil {
			out.days[d] = &weighedDay{Result: &causes.Result{}, fresh: make([]bool, len(crew.members)), residuals: l.residualsOf(r.Foreseen)}
		}
	}
	return out, nil
}

// lead goes from the first changed date to the last, through all that are held between them.
func (l *leader) lead(todo []rules.Date) (*weighed, error) {
	out := &weighed{crew: l.crew, days: make(map[rules.Date]*weighedDay, len(todo))}
	dates := slices.Clone(todo)
	for _, d := range l.j.held {
		if d > todo[0] && d < todo[len(todo)-1] {
			dates = append(dates, d)
		}
	}
	slices.Sort(dates)
	dates = slices.Compact(dates)
	for n, d := range dates {
		if n == len(dates)-1 {
			l.keepBehind()
		}
		if l.stopped != nil && l.stopped() != nil {
			return nil, l.stopped()
		}
		r, err := l.step(d)
		if err != nil {
			return nil, err
		}
		if _, ok := slices.BinarySearch(todo, d); ok && r != nil {
			withWrong(d, r)
			tidy(r)
			if err := l.offDate(d, r); err != nil {
				return nil, err
			}
			day := &weighedDay{Result: r, fresh: slices.Clone(l.fresh), woken: l.wokenNow(d, r)}
			if l.j.ofResiduals() {
				day.residuals = l.residualsOf(r.Foreseen)
			}
			r.Foreseen, r.Reference = nil, nil
			out.days[d] = day
		}
		if l.progress != nil {
			l.progress(int64(n+1), int64(len(dates)))
		}
	}
	out.conclude(l.j.held)
	return out, nil
}

// step gathers a date and has the pool go through it; nil when no member has a value.
func (l *leader) step(date rules.Date) (*causes.Result, error) {
	any, err := l.fill(date)
	if err != nil || !any {
		return nil, err
	}
	if err := l.recall(date); err != nil {
		return nil, err
	}
	l.decidedNow(date)
	l.upto = date
	return l.pool.Step(causes.Day{Date: date, Values: l.values, Fresh: l.fresh, Known: l.known}), nil
}

// fill gathers the values of a date: those held, overlaid by the file's. It says whether there is any.
func (l *leader) fill(date rules.Date) (any bool, err error) {
	_, held := slices.BinarySearch(l.j.held, date)
	for _, number := range l.crew.blocks {
		fillMissing(l.raw)
		if held && int(number)*BlockSize < l.j.heldNames {
			if _, err := l.view.Fill(Returns, date, number, 0, l.raw); err != nil {
				return false, err
			}
		}
		col := l.column(number, date)
		from, to := l.crew.in(task{block: number, width: BlockSize})
		for m := from; m < to; m++ {
			at := int(l.crew.series[m] % BlockSize)
			l.values[m], l.fresh[m], l.first[m] = rules.Units(l.raw[at]), false, l.raw[at] == Missing64
			if col != nil && at < col.Len() && col.has(at) {
				l.values[m], l.fresh[m] = rules.Units(col.units(at)), true
			}
		}
		if err := l.onlyDaily(date, number, held && int(number)*BlockSize < l.j.heldNames); err != nil {
			return false, err
		}
		for m := from; m < to; m++ {
			any = any || l.values[m] != rules.Missing
		}
	}
	l.wake()
	return any, nil
}

// column is what the file changes of a block on a date, nil for nothing.
func (l *leader) column(number uint32, date rules.Date) *Column {
	days := l.blocks[number]
	n, ok := slices.BinarySearchFunc(days, date, func(d *day, at rules.Date) int { return cmp.Compare(d.date, at) })
	if !ok {
		return nil
	}
	return days[n].col
}

// units is the value of a cell that is there, as a return.
func (c *Column) units(offset int) int64 {
	mul := int64(rules.Pow10(rules.Places - int(c.Decimals)))
	if c.V32 != nil {
		return int64(c.V32[offset]) * mul
	}
	return c.V64[offset] * mul
}

// recall gathers what was concluded of the values of a date that are not judged now; nil where there is none of those.
func (l *leader) recall(date rules.Date) error {
	l.known = nil
	if _, held := slices.BinarySearch(l.j.held, date); !held {
		return nil
	}
	l.known = []causes.Known{}
	for _, number := range l.crew.blocks {
		clear(l.raw)
		if err := l.view.Patch(l.j.concluded, date, number, 0, l.raw); err != nil {
			return err
		}
		from, to := l.crew.in(task{block: number, width: BlockSize})
		for m := from; m < to; m++ {
			if use := causes.Use(l.raw[l.crew.series[m]%BlockSize]); use != causes.AsIs && !l.fresh[m] && l.values[m] != rules.Missing {
				l.know(causes.Known{Member: m, Use: use})
			}
		}
		if err := l.decided(date, number); err != nil {
			return err
		}
	}
	return nil
}

// know notes what is known of a value, in the place of what was noted before.
func (l *leader) know(k causes.Known) {
	if at := slices.IndexFunc(l.known, func(o causes.Known) bool { return o.Member == k.Member }); at >= 0 {
		l.known[at] = k
		return
	}
	l.known = append(l.known, k)
}

// decided adds what persons decided of the values of a date and block. It comes after what the pool concluded, and outweighs it.
func (l *leader) decided(date rules.Date, number uint32) error {
	marked, err := l.view.Marked(date, number)
	if err != nil {
		return err
	}
	marked = slices.DeleteFunc(marked, func(at int) bool {
		m, ok := l.crew.at[number*BlockSize+uint32(at)]
		return !ok || l.fresh[m] || l.values[m] == rules.Missing
	})
	if len(marked) == 0 {
		return nil
	}
	steps, err := versionSteps(l.view, date, number, marked)
	if err != nil {
		return err
	}
	for n, at := range marked {
		series := number*BlockSize + uint32(at)
		about, err := aboutValue(l.view, series, date, steps[n])
		if err != nil {
			return err
		}
		if about.decided != nil {
			m := l.crew.at[series]
			l.know(known(int(m), about.decided, l.values[m]))
		}
	}
	return nil
}

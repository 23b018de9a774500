package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// task is a run of neighbouring series of one block, with the days that a file changes for its block.
type task struct {
	block       uint32
	from, width int // offsets within the block
	days        []*day
	since       rules.Date // replay from here even where nothing changed; NoDate for the first day
}

// day is what a file changes on one date in one block.
type day struct {
	date rules.Date
	col  *Column // new and changed cells only
	old  []int64 // the block's values before, nil when nothing was held on the date

	terms []CellTerms // of the new and changed cells, where they are not the ordinary ones
}

// outcome is what judging a task found.
type outcome struct {
	counts Counts
	flags  []*FlagRow
	used   []UsedColumn
	states []partState
}

// worker judges tasks one after another with buffers of its own.
type worker struct {
	j     *judging
	view  View
	lanes []*lane

	raw, fresh, held []int64 // one date: every value, those judged now, those held before
	cand             []int32
	hits             []hit
	slot             []int32 // index into hits of each series, -1 for none
	ids              []string
	groups           []string
	late             []rules.Date // newest date held before, of each series
	upto             rules.Date   // newest date taken
	replayed         bool         // dates that were held before were gone through again
	behind           bool         // there are dates held from the first changed one on
	flags            []FlagRow    // made and not yet used
	room             outcome      // lists that the next task fills
	failed           error        // of looking up a flag
	keptNow          []keptTask   // for the resident
	stored           []*State     // by lane: what a recheck holds against the replay
	residuals        *residuals   // nil where no lane judges them
	task             task         // at hand
	terms            []int64      // codes that the ledger holds on one date
	past             pastRows     // of its lone series
	count            *workerCount // of a back-run, else nil
}

// hit is a series that is not plainly inside everything on the date at hand.
type hit struct {
	at       int32
	fresh    bool
	flagged  bool            // what windows take of it is not simply the value
	out      bool            // an error holds more than half: windows leave it out
	woken    bool            // judged anew although the file does not change it
	taken    bool            // it takes back a flagged value of the date before, and raises no flag of its own
	view     *causes.View    // what the pool says of it, nil for nothing
	decided  *rules.Act      // what somebody decided of it, nil for nothing
	verdicts []rules.Verdict // by lane
	limits   []rules.Limit
	broken   []int // indexes of limit ranges that it breaks
	outsize  bool
	group    string // of the series, when the value was judged
	days     int    // business days that the value covers, where these are several
}

func newWorker(j *judging, v View) *worker {
	w := &worker{j: j, view: v}
	for n, g := range j.gauges {
		if g.Range.Limit == nil && j.ids[n] != 0 {
			l := newLane(n, j.ids[n], g, j.width, j.members.Groupless())
			if j.kept != nil {
				l.track()
			}
			w.lanes = append(w.lanes, l)
			if l.residual && w.residuals == nil {
				w.residuals = newResiduals(j.width)
			}
		}
	}
	w.raw, w.fresh, w.held = make([]int64, j.width), make([]int64, j.width), make([]int64, j.width)
	w.slot = make([]int32, j.width)
	w.late = make([]rules.Date, j.width)
	for i := range w.slot {
		w.slot[i] = -1
	}
	if j.back != nil {
		w.count = j.back.of(w)
	}
	return w
}

// run judges a task: it loads the windows as they were before the first changed date, then goes forward date by date.
func (w *worker) run(t task) (outcome, error) {
	out := outcome{flags: w.room.flags[:0], used: w.room.used[:0]}
	first := t.since
	if first == rules.NoDate || len(t.days) > 0 && t.days[0].date < first {
		first = t.days[0].date
	}
	w.begin(t)
	if w.count != nil {
		w.count.open(t, w.group)
	}
	w.beginPast(first)
	replay := w.j.heldFrom(t.block, first)
	if err := w.noteNewest(t, replay); err != nil {
		return out, err
	}
	if err := w.load(t, first); err != nil {
		return out, err
	}
	days := t.days
	for len(days) > 0 || len(replay) > 0 {
		d, old := next(&days, &replay)
		w.upto, w.replayed = d.date, w.replayed || old
		if err := w.date(t, d, old, &out); err != nil {
			return out, err
		}
		if err := w.compareStates(t, d.date); err != nil {
			return out, err
		}
	}
	w.keepStates(t, &out)
	w.leave(t)
	if w.count != nil {
		w.count.fold(t, w.j.names, len(w.count.dates))
	}
	w.room = out
	out.flags, out.used = slices.Clone(out.flags), slices.Clone(out.used)
	return out, w.failed
}

// next takes the earlier of the next changed day and the next held date; old says that the date was held before.
func next(days *[]*day, replay *[]rules.Date) (d *day, old bool) {
	switch {
	case len(*replay) == 0 || len(*days) > 0 && (*days)[0].date < (*replay)[0]:
		d = (*days)[0]
		*days = (*days)[1:]
		return d, false
	case len(*days) > 0 && (*days)[0].date == (*replay)[0]:
		d = (*days)[0]
		*days = (*days)[1:]
	default:
		d = &day{date: (*replay)[0]}
	}
	*replay = (*replay)[1:]
	return d, true
}

// begin clears the worker for a task and looks up who its series are, where that matters.
func (w *worker) begin(t task) {
	w.task, w.ids, w.groups, w.replayed = t, w.ids[:0], w.groups[:0], false
	for _, l := range w.lanes {
		l.applies, l.days = nil, nil
	}
	w.beginDays(t)
	if w.j.members.Universal() {
		return
	}
	for i := range t.width {
		id := string(w.j.names.Name(t.series(i)))
		w.ids = append(w.ids, id)
		w.groups = append(w.groups, w.j.members.Group(id))
	}
	for _, l := range w.lanes {
		l.applies = w.j.appliesTo(l.index, w.ids, w.groups)
	}
}

// beginDays looks up the calendars of a task's series, where one has its own.
func (w *worker) beginDays(t task) {
	if w.j.days == nil {
		return
	}
	days := make([]*rules.Calendar, t.width)
	for i := range days {
		days[i] = w.j.days(string(w.j.names.Name(t.series(i))))
	}
	for _, l := range w.lanes {
		l.days = days
	}
}

// series is the number of the i-th series of the task.
func (t task) series(i int) uint32 { return t.block*BlockSize + uint32(t.from+i) }

func (w *worker) group(i int) string {
	if len(w.groups) == 0 {
		return ""
	}
	return w.groups[i]
}

// noteNewest finds, for the dates that are replayed, the newest one on which each series held a value, to know a late value.
func (w *worker) noteNewest(t task, replay []rules.Date) error {
	for i := range w.late {
		w.late[i] = rules.NoDate
	}
	w.behind = len(replay) > 0
	for _, d := range replay {
		vals := w.held[:t.width]
		ok, err := w.view.Fill(Returns, d, t.block, t.from, vals)
		if err != nil {
			return err
		}
		for i := range vals {
			if ok && vals[i] != Missing64 {
				w.late[i] = d
			}
		}
	}
	return nil
}

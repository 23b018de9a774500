package watcher

import (
	"math"

	"strayd/rules"
	"strayd/stats"
)

// dormantDays is the longest calendar gap that surely holds no more than rules.DormantAfter business days, whatever the calendar.
const dormantDays = rules.DormantAfter

// lane is the rolling state of one range for a run of neighbouring series.
type lane struct {
	index    int // of the range in the settings
	id       uint16
	gauge    *rules.Gauge
	windows  windows
	last     []rules.Date      // newest used observation of each series, NoDate when none
	dormant  []bool            // the window started anew after a gap
	applies  []bool            // nil when the range judges every series
	residual bool              // it judges what the reference leaves of a return
	days     []*rules.Calendar // of each series; nil when all have every weekday

	gate stats.Gate // nil where every value must be judged one by one
	thin bool       // a window may hold fewer than rules.LeastNormal values

	known  rules.Past // of the series at hand, see past
	at     int        // that series
	values []int64    // scratch for one series' window
	used   []int64    // scratch for one date

	// What a resident needs, see there.
	own     laneState    // the lane's own buffers while it works on what was kept
	kept    *kept        // what it was resumed from; nil when it was loaded
	spoilt  bool         // of no use for the next date
	leaving []int64      // scratch
	tracked bool         // streak and dates are kept up
	dates   []rules.Date // on which any series has a used value, ascending
	streak  []int32      // on how many of the newest of them each series has one
}

// laneState is what a task's state lies in.
type laneState struct {
	windows windows
	last    []rules.Date
	dormant []bool
}

// windows are the windows of many series side by side: the plain, weighted or sorted panel of stats.
type windows interface {
	Reset()
	Scan(vals []int64, gate stats.Gate, cand []int32) []int32
	Clear(i int)
	N(i int) int
}

// pusher is what a panel has that holds its values.
type pusher interface{ Push(vals []int64) }

// loader is what a panel has that depends on its window alone, so that it can be filled from the newest date backwards.
type loader interface {
	Prepend(vals []int64)
	Full(i int) bool
}

func newLane(index int, id uint16, g *rules.Gauge, width int, groupless bool) *lane {
	l := &lane{index: index, id: id, gauge: g, last: make([]rules.Date, width), dormant: make([]bool, width), used: make([]int64, width),
		residual: g.Range.Of == rules.Residual}
	l.gate, _ = g.Gate(groupless) // what a group lends to a provisional verdict must be noted, so that one is judged
	switch r := g.Range; {
	case r.Scale == rules.Weighted:
		l.windows = stats.NewWeightedPanel(width, r.Window, r.Decay, float64(rules.One))
	case r.Scale == rules.MAD, r.Tail.Name == "rank":
		l.windows = stats.NewSortedPanel(width, r.Window)
	default:
		l.windows = stats.NewPanel(width, r.Window)
	}
	l.own = laneState{l.windows, l.last, l.dormant}
	l.lend()
	return l
}

// track has the lane keep up what a resident needs.
func (l *lane) track() {
	if _, ok := l.windows.(*stats.Panel); ok && !l.residual {
		l.tracked, l.streak, l.leaving = true, make([]int32, len(l.last)), make([]int64, len(l.last))
	}
}

// lend gives the past its ways to the values of a window: made once, since a past is asked for at every hit.
func (l *lane) lend() {
	switch w := l.windows.(type) {
	case *stats.SortedPanel:
		l.known.Sorted = func() stats.Sorted { return w.Sorted(l.at) }
		l.known.Values = func() []int64 { return w.Sorted(l.at) }
	case *stats.Panel:
		l.known.Values = func() []int64 {
			l.values = w.Values(l.at, l.values[:0])
			return l.values
		}
	}
}

// reset empties the lane's own state and takes it up.
// between counts the business days of series i after one date, up to another.
func (l *lane) between(i int, from, to rules.Date) int {
	if l.days == nil {
		return rules.Weekdays(from, to)
	}
	return l.days[i].Between(from, to)
}

func (l *lane) reset() {
	l.windows, l.last, l.dormant, l.kept = l.own.windows, l.own.last, l.own.dormant, nil
	l.dates = l.dates[:0]
	clear(l.streak)
	l.windows.Reset()
	for i := range l.last {
		l.last[i] = rules.NoDate
	}
	clear(l.dormant)
	l.thin = true
}

// candidates appends the series whose value on a date is not surely inside.
func (l *lane) candidates(fresh []int64, cand []int32) []int32 {
	if l.gate != nil {
		return l.windows.Scan(fresh, l.gate, cand)
	}
	for i, v := range fresh {
		if v != Missing64 {
			cand = append(cand, int32(i))
		}
	}
	return cand
}

// rest restarts the window of every series whose newest used value is too old on a date on which it has a value again.
func (l *lane) rest(date rules.Date, vals []int64) {
	last := l.last[:len(vals)]
	edge := date - dormantDays
	for i, v := range vals {
		if last[i] < edge && v != Missing64 && last[i] != rules.NoDate && l.between(i, last[i], date) > rules.DormantAfter {
			l.windows.Clear(i)
			l.thin = true
			last[i] = rules.NoDate
			l.dormant[i] = true
		}
	}
}

// push lets the windows take the used values of a date.
func (l *lane) push(date rules.Date, used []int64) {
	l.windows.(pusher).Push(used)
	if l.tracked {
		l.trackForward(date, used)
	}
	l.note(date, used)
}

// trackForward notes who has a value on a date later than all before.
func (l *lane) trackForward(date rules.Date, used []int64) {
	if count(used) == 0 {
		return
	}
	l.dates = append(l.dates, date)
	for i, v := range used {
		if l.streak[i]++; v == Missing64 {
			l.streak[i] = 0
		}
	}
}

// trackBack notes who has a value on a date earlier than all before; dates stand in reverse until the load has ended.
func (l *lane) trackBack(date rules.Date, used []int64) {
	if len(l.dates) == l.gauge.Range.Window || count(used) == 0 {
		return
	}
	step := int32(len(l.dates))
	l.dates = append(l.dates, date)
	for i, v := range used {
		if v != Missing64 && l.streak[i] == step {
			l.streak[i]++
		}
	}
}

// note takes down on which date each series had its newest used value.
func (l *lane) note(date rules.Date, used []int64) {
	last := l.last[:len(used)]
	for i, v := range used {
		if v != Missing64 {
			last[i] = date
		}
	}
}

// past is what the lane knows of series i before the date at hand, valid until it is asked for another.
func (l *lane) past(i int) *rules.Past {
	p := &l.known
	l.at = i
	p.N, p.Dormant, p.Group, p.Days, p.DF = l.windows.N(i), l.dormant[i], rules.Num{}, 0, 0
	switch w := l.windows.(type) {
	case *stats.WeightedPanel:
		p.Var = w.State(i).V
	case *stats.SortedPanel:
		p.Sums = stats.Sums{}
		if l.gauge.Range.Scale == rules.Plain {
			for _, k := range w.Sorted(i) {
				p.Sums.Add(k)
			}
		}
	case *stats.Panel:
		p.Sums = w.Sums(i)
	case *stats.Slide:
		p.Sums = w.Sums(i)
	}
	return p
}

// whole says that every value is there and may enter a window.
func whole(vals []int64) bool {
	most := uint64(0)
	for _, v := range vals {
		most = max(most, uint64(v+int64(rules.WindowLimit)))
	}
	return most <= uint64(2*rules.WindowLimit)
}

// outsize leaves out of a row of values those that may never enter a window.
func outsize(vals []int64) {
	for i, v := range vals {
		if v > int64(rules.WindowLimit) || v < -int64(rules.WindowLimit) {
			vals[i] = Missing64
		}
	}
}

// oversize appends the series whose value may never enter a window.
func oversize(vals []int64, at []int32) []int32 {
	for i, v := range vals {
		if uint64(v+int64(rules.WindowLimit)) > uint64(2*rules.WindowLimit) && v != math.MinInt64 {
			at = append(at, int32(i))
		}
	}
	return at
}

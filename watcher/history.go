package watcher

import (
	"fmt"
	"slices"
	"sort"

	"strayd/rules"
	"strayd/stats"
)

// Row is one observation under one range, with every figure behind its verdict, as it was known when the verdict was given.
type Row struct {
	Series     string
	Group      string
	Date       rules.Date
	Return     rules.Units
	Range      string
	WindowFrom rules.Date // of the used observations behind the estimate; NoDate when there are none
	WindowTo   rules.Date
	rules.Verdict
	Used rules.Units // what the window holds of it now; Missing when left out, or under a limit

	Residual rules.Num // of a residual range: what was judged; its lines are where they lie for the return, its used values are residuals

	Step    uint32 // the step whose knowledge the verdict rests on
	Window  []Used // filled on request only
	Limited bool   // the range is a limit, which has no window
	Of      rules.Basis

	residual rules.Units
}

// Apart says that the range has nothing to do with the value: a limit has no window, and what has no residual enters none.
func (r *Row) Apart() bool { return r.Limited || r.Of == rules.Residual && !r.Residual.OK }

// Judged is what the range judged: the return, or its residual. Used compares with it.
func (r *Row) Judged() rules.Units {
	if r.Residual.OK {
		return r.residual
	}
	return r.Return
}

// Used is one used observation of a window.
type Used struct {
	Date         rules.Date
	Return, Used rules.Units
}

// Reader recomputes verdicts from what a view holds. It goes by the definition of each figure, value by value, and shares no
// running state with the pass.
type Reader struct {
	View  View
	Names *Names

	settings map[uint32]*recorded
	files    map[uint32]FileRow
}

// recorded is one settings text made ready for judging.
type recorded struct {
	*rules.Settings
	members *rules.Membership
	gauges  []*rules.Gauge
	ids     []uint16

	terms     uint16 // number of terms in the ledger, 0 where there are none
	residuals uint16 // number of what the ledger keeps of residuals, 0 where it keeps none
}

// NewReader reads the dictionary and prepares a reader.
func NewReader(v View) (*Reader, error) {
	names, err := v.Names()
	return newReader(v, names), err
}

func newReader(v View, names *Names) *Reader {
	return &Reader{View: v, Names: names, settings: map[uint32]*recorded{}, files: map[uint32]FileRow{}}
}

// UnknownSeries is the error for a series that the ledger does not have.
type UnknownSeries struct{ Series string }

func (e *UnknownSeries) Error() string { return fmt.Sprintf("no series %q in the ledger", e.Series) }

// past of one series: everything that is held of it.
type seriesPast struct {
	id       uint32
	name     string
	group    string
	calendar *rules.Calendar
	versions []Version            // by date, then step
	dates    []int                // where each date begins in versions
	used     map[uint16][]Version // by range number
}

func (r *Reader) series(name string) (*seriesPast, error) {
	id, ok := r.Names.Find([]byte(name))
	if !ok {
		return nil, &UnknownSeries{name}
	}
	versions, err := r.View.Series(Returns, id)
	if err != nil {
		return nil, err
	}
	s := &seriesPast{id: id, name: name, versions: versions, used: map[uint16][]Version{}}
	for i, v := range versions {
		if i == 0 || versions[i-1].Date != v.Date {
			s.dates = append(s.dates, i)
		}
	}
	return s, nil
}

// ends is where the versions of the n-th date end.
func (s *seriesPast) ends(n int) int {
	if n+1 < len(s.dates) {
		return s.dates[n+1]
	}
	return len(s.versions)
}

// latest is the newest version of the n-th date as of a step; ok is false when there was none yet.
func (s *seriesPast) latest(n int, asOf uint32) (v Version, ok bool) {
	for i := s.dates[n]; i < s.ends(n); i++ {
		if s.versions[i].Step <= asOf {
			v, ok = s.versions[i], true
		}
	}
	return v, ok
}

// usedAt is the used value of a date as of a step, the return itself where nothing else was stored.
func usedAt(used []Version, date rules.Date, value int64, asOf uint32) int64 {
	at := sort.Search(len(used), func(i int) bool { return used[i].Date >= date })
	for ; at < len(used) && used[at].Date == date && used[at].Step <= asOf; at++ {
		value = used[at].Value
	}
	if !rules.InWindow(rules.Units(value)) {
		return Missing64
	}
	return value
}

// History gives each observation of a series under each range that judges it, by date, then in the configuration's order.
func (r *Reader) History(name string, from, to rules.Date) ([]Row, error) {
	s, err := r.series(name)
	if err != nil {
		return nil, err
	}
	var rows []Row
	for n, at := range s.dates {
		if date := s.versions[at].Date; date < from || to != rules.NoDate && date > to {
			continue
		}
		day, err := r.rows(s, n, ^uint32(0), false)
		if err != nil {
			return nil, err
		}
		rows = append(rows, day...)
	}
	return rows, nil
}

// At gives the rows of one date with their windows, as known at a step; ^uint32(0) for now.
func (r *Reader) At(name string, date rules.Date, asOf uint32) ([]Row, []Version, error) {
	s, err := r.series(name)
	if err != nil {
		return nil, nil, err
	}
	n, ok := slices.BinarySearchFunc(s.dates, date, func(at int, d rules.Date) int { return int(s.versions[at].Date) - int(d) })
	if !ok {
		return nil, nil, fmt.Errorf("series %q has no observation on %s", name, date)
	}
	rows, err := r.rows(s, n, asOf, true)
	return rows, s.versions[s.dates[n]:s.ends(n)], err
}

// rows judges the n-th date of a series once more, as it was judged when its newest version (as of a step) arrived.
func (r *Reader) rows(s *seriesPast, n int, asOf uint32, windows bool) ([]Row, error) {
	v, ok := s.latest(n, asOf)
	if !ok {
		return nil, fmt.Errorf("series %q had no observation on %s then", s.name, s.versions[s.dates[n]].Date)
	}
	set, err := r.settingsOf(v.Step)
	if err != nil {
		return nil, err
	}
	s.group, s.calendar = set.members.Group(s.name), set.CalendarFor(s.name)
	now, err := r.terms(s, set, v.Date, asOf)
	if err != nil {
		return nil, err
	}
	arrival, err := r.arrival(s, n, v, set)
	if err != nil {
		return nil, err
	}
	var out []Row
	for k, rng := range set.Ranges {
		if !set.members.Applies(k, s.name, s.group) {
			continue
		}
		row := Row{Series: s.name, Group: s.group, Date: v.Date, Return: rules.Units(v.Value), Range: rng.Name, Step: v.Step,
			WindowFrom: rules.NoDate, WindowTo: rules.NoDate, Used: rules.Missing, Limited: rng.Limit != nil, Of: rng.Of}
		if err := r.judge(s, n, v, set, k, &row, windows); err != nil {
			return nil, err
		}
		row.Why = join(row.Why, arrival)
		if now.Estimate {
			row.Why = join(row.Why, "estimate")
		}
		out = append(out, row)
	}
	return out, nil
}

func join(a, b string) string {
	if a == "" || b == "" {
		return a + b
	}
	return a + "; " + b
}

// judge fills in a row's verdict.
func (r *Reader) judge(s *seriesPast, n int, v Version, set *recorded, k int, row *Row, windows bool) error {
	g := set.gauges[k]
	if g.Range.Limit != nil {
		row.Verdict = g.Judge(row.Return, nil)
		return nil
	}
	used, err := r.usedOf(s, set.ids[k])
	if err != nil {
		return err
	}
	terms, err := r.terms(s, set, v.Date, v.Step)
	if err != nil {
		return err
	}
	if g.Range.Of == rules.Residual {
		return r.judgeResidual(s, n, v, set, k, used, terms, row, windows)
	}
	w := s.window(n, v.Date, v.Step, g, used, nil)
	w.past.Group, err = r.groupScale(set.ids[k], s.group, v)
	if err != nil {
		return err
	}
	if w.past.DF, err = r.learnt(g, set.ids[k], s.group, v.Date); err != nil {
		return err
	}
	w.past.Days = terms.Days
	row.Verdict = g.Judge(row.Return, &w.past)
	row.WindowFrom, row.WindowTo = w.from, w.to
	row.Used = rules.Units(usedAt(used, v.Date, v.Value, ^uint32(0)))
	if windows {
		row.Window = w.list()
	}
	return nil
}

func (r *Reader) usedOf(s *seriesPast, id uint16) ([]Version, error) {
	if used, ok := s.used[id]; ok {
		return used, nil
	}
	used, err := r.View.Used(id, s.id)
	s.used[id] = used
	return used, err
}

// pastWindow is the window before an observation, gathered by definition.
type pastWindow struct {
	past     rules.Past
	from, to rules.Date
	values   []Used // newest first
}

// list is the window, oldest first.
func (w *pastWindow) list() []Used {
	out := slices.Clone(w.values)
	slices.Reverse(out)
	return out
}

// window gathers the used observations before the n-th date as they were known at a step: the last `window` ones (all of them for the
// weighted scale), back to the first gap that made the series dormant. For a residual range, residuals are what is used where nothing else
// is; else nil.
func (s *seriesPast) window(n int, date rules.Date, step uint32, g *rules.Gauge, used, residuals []Version) *pastWindow {
	w := &pastWindow{from: rules.NoDate, to: rules.NoDate}
	most := g.Range.Window
	if g.Range.Scale == rules.Weighted {
		most = len(s.dates)
	}
	later := date
	for i := n - 1; i >= 0 && len(w.values) < most; i-- {
		held, ok := s.latest(i, step)
		if ok && g.Range.Of == rules.Residual {
			held.Value = valueOn(residuals, held.Date, step)
			ok = held.Value != Missing64
		}
		if !ok {
			continue
		}
		if s.calendar.Between(held.Date, later) > rules.DormantAfter {
			w.past.Dormant = len(w.values) == 0
			break
		}
		if k := usedAt(used, held.Date, held.Value, step); k != Missing64 {
			w.values = append(w.values, Used{held.Date, rules.Units(held.Value), rules.Units(k)})
			later = held.Date
		}
	}
	w.fill(g)
	return w
}

// fill computes what judging needs of the window.
func (w *pastWindow) fill(g *rules.Gauge) {
	values := make([]int64, 0, len(w.values))
	for i := len(w.values) - 1; i >= 0; i-- {
		values = append(values, int64(w.values[i].Used))
	}
	w.past.N = len(values)
	if len(values) > 0 {
		w.from, w.to = w.values[len(w.values)-1].Date, w.values[0].Date
	}
	if g.Range.Scale == rules.Weighted {
		w.past.Var = weightedVariance(values, g.Range)
		return
	}
	for _, k := range values {
		w.past.Sums.Add(k)
	}
	w.past.Values = func() []int64 { return values }
	w.past.Sorted = func() stats.Sorted { return stats.SortedOf(values) }
}

// weightedVariance replays the weighted mean square from its seed.
func weightedVariance(values []int64, r rules.Range) float64 {
	panel := stats.NewWeightedPanel(1, r.Window, r.Decay, float64(rules.One))
	for _, k := range values {
		panel.Push([]int64{k})
	}
	return panel.State(0).V
}

// groupScale is the deviation that the group lent to a provisional verdict.
func (r *Reader) groupScale(id uint16, group string, v Version) (rules.Num, error) {
	if group == "" {
		return rules.Num{}, nil
	}
	scales, err := r.View.GroupScales(id, group)
	if err != nil {
		return rules.Num{}, err
	}
	var out rules.Num
	at := sort.Search(len(scales), func(i int) bool { return scales[i].Date >= v.Date })
	for ; at < len(scales) && scales[at].Date == v.Date && scales[at].Step <= v.Step; at++ {
		out = rules.Some(scales[at].Deviation)
	}
	return out, nil
}

// arrival says of a value that it came late or was restated.
func (r *Reader) arrival(s *seriesPast, n int, v Version, set *recorded) (string, error) {
	now, err := r.terms(s, set, v.Date, v.Step)
	if err != nil {
		return "", err
	}
	first := s.versions[s.dates[n]]
	why := ""
	for i := n + 1; i < len(s.dates); i++ {
		if s.versions[s.dates[i]].Step < first.Step {
			why = "arrived late"
			break
		}
	}
	if v.Step == first.Step {
		return why, nil
	}
	var before Version
	for i := s.dates[n]; s.versions[i].Step < v.Step; i++ {
		before = s.versions[i]
	}
	was, err := r.terms(s, set, v.Date, before.Step)
	note := join(RestatedNote(rules.Units(before.Value), rules.Units(v.Value)), now.After(was))
	return join(why, "restated: "+note), err
}

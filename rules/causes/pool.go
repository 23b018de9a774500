package causes

import (
	"cmp"
	"math"
	"slices"

	"strayd/rules"
)

// Pool is the state of series that are judged together.
type Pool struct {
	members  []Member
	groups   []string
	doubtful float64

	peers       [][]int // members of each group
	benchmarks  []int   // members that others are held against
	followers   map[int][]int
	isReference []bool

	states []state
	looks  []look

	t                     int // number of today's date, from 1
	date                  rules.Date
	before                rules.Date // the date before
	newWeek, newFortnight bool

	odds    []histogram // by group, then of those without one, then of all
	line    []lineAt
	binOdds [bins]float64
	sound   [bins]float64 // by log odds: how probably a value is no error
	lend    []lending
	happens []float64 // by group: how often something happens

	shift shift
	alike []alike // by place in benchmarks

	scratch
}

// scratch is room for the work of one date.
type scratch struct {
	slow    []weighing // values that are not plainly ordinary
	row     []ranked
	triples []triple
	contra  []contradiction
	sizes   []float64
	merged  []odd
	totals  []float64
	says    []implied
}

// NewPool makes an empty pool. doubtful is the share of ordinary values that may be flagged doubtful, stale or repeat, together.
func NewPool(members []Member, groups []string, doubtful float64) *Pool {
	p := &Pool{members: slices.Clone(members), groups: groups, doubtful: doubtful, before: rules.NoDate, date: rules.NoDate,
		followers: map[int][]int{}, newWeek: true}
	p.peers = make([][]int, len(groups))
	p.isReference = make([]bool, len(members))
	p.states, p.looks = make([]state, len(members)), make([]look, len(members))
	for i, m := range members {
		p.states[i] = newState()
		p.members[i].Events = slices.Clone(m.Events)
		slices.SortStableFunc(p.members[i].Events, func(a, b rules.Event) int { return cmp.Compare(a.Date, b.Date) })
		if m.Group >= 0 {
			p.peers[m.Group] = append(p.peers[m.Group], i)
		}
		if m.Reference.Kind == Series {
			p.followers[m.Reference.Series] = append(p.followers[m.Reference.Series], i)
			p.isReference[m.Reference.Series] = true
		}
		if m.FX >= 0 {
			p.isReference[m.FX] = true
		}
	}
	for i := range members {
		if len(p.followers[i]) > 0 {
			p.benchmarks = append(p.benchmarks, i)
			p.alike = append(p.alike, newAlike())
		}
	}
	p.odds = make([]histogram, len(groups)+2)
	p.line = make([]lineAt, len(groups)+2)
	p.lend = make([]lending, len(groups))
	p.happens = make([]float64, len(groups)+2)
	p.learn()
	return p
}

// Step judges a date, later than every one before, and takes it into the state.
func (p *Pool) Step(d Day) *Result {
	r := &Result{}
	p.open(d)
	p.learn()
	p.references()
	for i := range p.members {
		p.refit(i)
		p.prepare(i)
	}
	p.contradictions(r)
	p.couple()
	for i := range p.members {
		if p.plain(i) {
			p.states[i].chain.broken()
			continue
		}
		p.weigh(i)
	}
	p.swaps()
	p.spikes(r)
	for k := range p.slow {
		p.conclude(&p.slow[k], r)
	}
	p.markets(r)
	slices.SortStableFunc(r.Views, func(a, b View) int { return a.Member - b.Member })
	p.foreseen(r)
	p.known(d)
	p.close(d)
	now := p.shift.today
	p.shift = shift{late: now.late, early: now.early, contradicted: now.contradicted}
	return r
}

// open turns to a new date: what is too old is forgotten, today's values are laid out.
func (p *Pool) open(d Day) {
	p.t++
	p.newWeek = p.date == rules.NoDate || weekOf(d.Date) != weekOf(p.date)
	p.newFortnight = p.newWeek && (p.date == rules.NoDate || weekOf(d.Date)/2 != weekOf(p.date)/2)
	newMonth := p.date == rules.NoDate || d.Date.Time().Month() != p.date.Time().Month()
	p.before, p.date = p.date, d.Date
	p.slow = p.slow[:0]
	for g := range p.odds {
		p.odds[g].expire(p.t)
	}
	for i := range p.members {
		st := &p.states[i]
		st.expire(p.t)
		st.isOut, st.isWrong = false, false
		if newMonth {
			st.sofar = 1
		}
		for e := p.members[i].Events; st.event < len(e) && e[st.event].Date < d.Date-eventDays; {
			st.event++
		}
		p.looks[i] = look{u: d.Values[i], x: math.NaN()}
		if u := d.Values[i]; u != rules.Missing {
			p.looks[i].x, p.looks[i].places = u.Float(), decimals(u)
		}
	}
}

// weekOf numbers weeks that begin on Monday.
func weekOf(d rules.Date) int { return (int(d) + 1_000_003) / 7 }

// couple has the partner of a swap that may go on weighed too.
func (p *Pool) couple() {
	for i := range p.states {
		if c := &p.states[i].chain; c.active && c.partner >= 0 && c.carry[runSwapped] > leastCarried {
			p.looks[c.partner].coupled = true
		}
	}
}

// plain says that nothing about a value calls for weighing.
func (p *Pool) plain(i int) bool {
	lk, st := &p.looks[i], &p.states[i]
	if !lk.judged || lk.elsewhere {
		return true
	}
	switch {
	case st.chain.active, lk.finer, lk.coupled, lk.mark != markSeen, p.members[i].FX >= 0, st.held.is:
		return false
	case math.Abs(lk.z) > 2, math.Abs(lk.ownZ) > 2.5:
		return false
	case math.Abs(lk.x) < 0.02*(math.Abs(lk.mu)+2*lk.s):
		return false
	}
	return len(p.near(i)) == 0
}

// foreseen lists what the references foresee, as it stood before the values of today were weighed.
func (p *Pool) foreseen(r *Result) {
	r.Foreseen, r.Reference = make([]rules.Num, len(p.members)), make([]rules.Num, len(p.members))
	for i := range p.looks {
		if lk := &p.looks[i]; lk.hasRef {
			r.Foreseen[i], r.Reference[i] = rules.Some(lk.mu), rules.Some(lk.m)
		}
	}
}

// known takes over what was concluded before. A reference that turns out wrong now stays out.
func (p *Pool) known(d Day) {
	if d.Known == nil {
		return
	}
	for i := range p.states {
		if st := &p.states[i]; !(st.isWrong && p.followed(i, d)) && (d.Fresh == nil || !d.Fresh[i]) {
			st.isOut = false
		}
	}
	for _, k := range d.Known {
		st := &p.states[k.Member]
		switch k.Use {
		case AsIs:
			p.looks[k.Member].full = true
			if !st.isWrong && d.Fresh != nil && d.Fresh[k.Member] { // decided before it is judged, as in a back-run
				st.isOut = false
			}
		case Out:
			st.isOut = true
		case Instead:
			p.looks[k.Member].x = k.Value.Float()
		}
	}
}

// followed says that a reference is held against values that are judged now.
func (p *Pool) followed(i int, d Day) bool {
	return slices.ContainsFunc(p.followers[i], func(m int) bool { return d.Fresh == nil || d.Fresh[m] })
}

// close takes today's values into the windows.
func (p *Pool) close(d Day) {
	judged := p.odds[:len(p.odds):len(p.odds)]
	for k := range p.alike {
		p.alike[k].learn(p.t)
	}
	for i := range p.members {
		st, lk := &p.states[i], &p.looks[i]
		if h := &st.held; h.is {
			if !h.out {
				st.enter(h.t, &h.look)
				if math.Abs(h.look.z) > breachZ {
					judged[p.histogramOf(i)].happened(p.t)
				}
			}
			h.is = false
		}
		st.remember(p.t, d.Values[i], lk)
		st.yesterday = lk.x
		if lk.x != lk.x {
			continue
		}
		st.sofar *= 1 + lk.x
		if lk.judged {
			judged[p.histogramOf(i)].judged(p.t, 1)
			judged[len(judged)-1].judged(p.t, 1)
		}
		switch {
		case lk.judged && !lk.elsewhere && (math.Abs(lk.z) > 4 || math.Abs(lk.ownZ) > 4):
			st.held = held{true, st.isOut, p.t, *lk}
			st.ref[p.t&mask] = lk.m
			if st.isOut {
				st.leaveOut(p.t, lk.m)
			}
		case st.isOut:
			st.leaveOut(p.t, lk.m)
		default:
			st.enter(p.t, lk)
		}
	}
}

func (p *Pool) histogramOf(i int) int {
	if g := p.members[i].Group; g >= 0 {
		return g
	}
	return len(p.odds) - 2
}

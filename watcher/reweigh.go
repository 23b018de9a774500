package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// Reweighed is what the weighing says of one value, made again.
type Reweighed struct {
	View            *causes.View // nil where nothing calls for weighing
	Reference       string       // id of the benchmark, or "peers"; "" for none
	ReferenceReturn rules.Num
	Residual        rules.Num
}

// Weigh makes the weighing of a value again, as it was known at a step: a pool is led through the dates before it, or, for a lone series, its
// own past is gathered.
func (r *Reader) Weigh(series string, date rules.Date, step uint32) (*Reweighed, error) {
	l, member, err := r.leaderAt(series, step)
	if err != nil {
		return nil, err
	}
	if l == nil {
		return r.weighLone(series, date, step)
	}
	if err := l.warm(date); err != nil {
		return nil, err
	}
	if _, err := l.fill(date); err != nil {
		return nil, err
	}
	if err := l.freshAt(date, step); err != nil {
		return nil, err
	}
	if l.values[member] == rules.Missing { // it covers several business days
		return &Reweighed{}, nil
	}
	l.fresh[member] = true
	if err := l.recall(date); err != nil {
		return nil, err
	}
	said := l.pool.Step(causes.Day{Date: date, Values: l.values, Fresh: l.fresh, Known: l.known})
	withWrong(date, said)
	tidy(said)
	out := &Reweighed{View: (&weighedDay{Result: said}).view(int32(member))}
	if f := said.Foreseen[member]; f.OK && l.values[member] != rules.Missing {
		m := l.crew.members[member]
		out.Reference = rules.PeersReference
		if m.Reference.Kind == causes.Series {
			out.Reference = l.crew.members[m.Reference.Series].ID
		}
		out.ReferenceReturn, out.Residual = said.Reference[member], rules.Some(l.values[member].Float()-f.V)
	}
	return out, nil
}

// leaderAt is a leader with an empty pool that reads the ledger as of a step, and the member that a series is; nil when it is none.
func (r *Reader) leaderAt(series string, step uint32) (*leader, int, error) {
	set, err := r.settingsOf(step)
	if err != nil {
		return nil, 0, err
	}
	crew := newCrew(r.Names, set.members, set.Settings)
	id, _ := r.Names.Find([]byte(series))
	if crew == nil {
		return nil, 0, nil
	}
	member, ok := crew.at[id]
	if !ok {
		return nil, 0, nil
	}
	v := r.View.AsOf(step)
	j := &judging{names: r.Names, heldNames: r.Names.Len(), step: step}
	if j.held, err = v.Dates(Returns); err != nil {
		return nil, 0, err
	}
	ids, err := rangeIDs(v)
	if err != nil {
		return nil, 0, err
	}
	j.concluded, j.residuals, j.terms = ids[concludedKey], ids[residualKey], ids[termsKey]
	l := newLeader(crew, j, v)
	l.pool = newPool(crew.members, crew.groups, set.Doubtful)
	return l, int(member), nil
}

// freshAt marks the values of a date that a step brought.
func (l *leader) freshAt(date rules.Date, step uint32) error {
	for _, number := range l.crew.blocks {
		from, to := l.crew.in(task{block: number, width: BlockSize})
		offsets := make([]int, 0, to-from)
		for m := from; m < to; m++ {
			offsets = append(offsets, int(l.crew.series[m]%BlockSize))
		}
		steps, err := versionSteps(l.view, date, number, offsets)
		if err != nil {
			return err
		}
		for n := range offsets {
			l.fresh[from+n] = steps[n] == step
		}
	}
	if !slices.Contains(l.fresh, false) {
		l.known = nil
	}
	return nil
}

// weighLone makes the weighing of a value of a lone series again.
func (r *Reader) weighLone(series string, date rules.Date, step uint32) (*Reweighed, error) {
	id, _ := r.Names.Find([]byte(series))
	v := r.View.AsOf(step)
	held, err := v.Dates(Returns)
	if err != nil {
		return nil, err
	}
	ids, err := rangeIDs(v)
	if err != nil {
		return nil, err
	}
	cell := make([]int64, 1)
	value := rules.Missing
	if ok, err := v.Fill(Returns, date, id/BlockSize, int(id%BlockSize), cell); err != nil {
		return nil, err
	} else if ok {
		value = rules.Units(cell[0])
	}
	j := &judging{terms: ids[termsKey]}
	if err := j.withoutSpans(v, date, id/BlockSize, int(id%BlockSize), cell); err != nil || value == rules.Missing || cell[0] == Missing64 {
		return nil, err
	}
	before := rules.Missing
	var past []rules.Units
	n, _ := slices.BinarySearch(held, date)
	for n--; n >= 0 && len(past) < lonePast; n-- {
		ok, err := v.Fill(Returns, held[n], id/BlockSize, int(id%BlockSize), cell)
		if err != nil {
			return nil, err
		}
		if !ok {
			continue
		}
		if len(past) == 0 {
			before = rules.Units(cell[0])
		}
		if err := j.withoutSpans(v, held[n], id/BlockSize, int(id%BlockSize), cell); err != nil {
			return nil, err
		}
		past = append(past, rules.Units(cell[0]))
	}
	slices.Reverse(past)
	said, _ := causes.NewLone().Weigh(past, before, date, value)
	return &Reweighed{View: &said}, nil
}

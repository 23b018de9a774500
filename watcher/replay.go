package watcher

import (
	"cmp"
	"fmt"
	"slices"

	"strayd/rules"
)

// valueAt is one observation.
type valueAt struct {
	series uint32
	date   rules.Date
}

// conclude has the windows take what is decided: the used values from the date of each value on whose decision changes are replayed into
// the batch, and the answer says what would now differ.
func (d *deciding) conclude(b *Batch) error {
	names, err := d.view.Names()
	if err != nil {
		return err
	}
	changed, err := d.changed(names)
	if err != nil || len(changed) == 0 {
		return err
	}
	p, err := d.p.underRecorded(d.view)
	if err != nil {
		return err
	}
	if err := p.replay(d.view, b, names, changed); err != nil {
		return err
	}
	all, err := differences(d.view, b, names, p.Settings, changed)
	e := &d.answer.Entry
	e.Differ = all[:min(len(all), rules.MostDiffer)]
	e.More = len(all) - len(e.Differ)
	return err
}

// underRecorded is the pass under the settings recorded last: a decision does not change them.
func (p *Pass) underRecorded(v View) (*Pass, error) {
	_, settings, err := lastSettings(v)
	if err != nil {
		return nil, err
	}
	q := *p
	q.Settings = *settings
	return &q, nil
}

// changed are the values of which something else is decided than before.
func (d *deciding) changed(names *Names) (map[valueAt]*rules.Act, error) {
	out := map[valueAt]*rules.Act{}
	for _, ref := range d.answer.Entry.Refs {
		f := d.flags[ref]
		id, ok := names.Find([]byte(f.Series))
		if f.Series == "" || !ok || !slices.Contains(rules.Concluded, f.Kind) {
			continue
		}
		at := valueAt{id, f.Date}
		steps, err := versionSteps(d.view, f.Date, id/BlockSize, []int{int(id % BlockSize)})
		if err != nil {
			return nil, err
		}
		if f.Step < steps[0] {
			d.answer.Notes = append(d.answer.Notes, fmt.Sprintf("flag %d was raised for a value that has been restated since: no window changes", ref))
			continue
		}
		about, err := aboutValue(d.view, id, f.Date, steps[0])
		if err != nil {
			return nil, err
		}
		if err := d.agree(f, &about); err != nil {
			return nil, err
		}
		if about.decided == nil || !alike(about.decided, f.Decided) {
			out[at] = f.Decided
		}
	}
	return out, nil
}

// agree sees to it that the decided flags of one value say the same.
func (d *deciding) agree(f *rules.Flag, about *about) error {
	for i := range about.flags {
		other := &about.flags[i]
		if now := d.flags[other.Ref]; now != nil {
			other = now
		}
		if other.Decided != nil && !alike(other.Decided, f.Decided) {
			return fmt.Errorf("flag %d of the same value is decided %s: give the refs of both, so that they say the same", other.Ref, other.Decided.Words())
		}
	}
	return nil
}

// alike says that windows take the same by two decisions.
func alike(a, b *rules.Act) bool { return a.Conclusion == b.Conclusion && a.Value == b.Value }

// replay puts into a batch the used values, and the states, that follow from decisions about values held.
func (p *Pass) replay(v View, b *Batch, names *Names, decided map[valueAt]*rules.Act) error {
	j := &judging{names: names, heldNames: names.Len(), firstNames: names.Len(), newest: rules.NoDate, now: p.Now, step: b.Step, nextRef: v.NextRef(),
		decided: decided}
	if err := p.prepare(j, v); err != nil {
		return err
	}
	j.scales = newGroupScales(j, v, nil)
	outs, err := p.runTasks(j, replayTasks(j, decided))
	if err != nil {
		return err
	}
	p.assemble(b, j, outs)
	b.Scales, err = j.scales.stored()
	return err
}

// replayTasks go through the blocks of some values, each from the first of them on.
func replayTasks(j *judging, values map[valueAt]*rules.Act) []task {
	since := map[uint32]rules.Date{}
	for at := range values {
		number := at.series / BlockSize
		if first, ok := since[number]; !ok || at.date < first {
			since[number] = at.date
		}
	}
	var blocks []block
	for _, bl := range allBlocks(j.names.Len(), rules.NoDate) {
		if first, ok := since[bl.number]; ok {
			bl.since = first
			blocks = append(blocks, bl)
		}
	}
	return tasks(blocks, j.width)
}

// replayed is a view in which the used values of a batch are published already.
type replayed struct {
	View
	batch *Batch
}

func (v *replayed) Used(rangeID uint16, id uint32) ([]Version, error) {
	list, err := v.View.Used(rangeID, id)
	if err != nil {
		return nil, err
	}
	list = slices.Clone(list)
	for i := range v.batch.Used {
		u := &v.batch.Used[i]
		if u.Range != rangeID || u.Block != id/BlockSize {
			continue
		}
		if at, ok := slices.BinarySearch(u.Offsets, uint16(id%BlockSize)); ok {
			list = append(list, Version{Date: u.Date, Step: v.batch.Step, Value: u.Values[at]})
		}
	}
	slices.SortStableFunc(list, func(a, b Version) int { return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Step, b.Step)) })
	return list, nil
}

// differences lists the observations after decided values of which the windows, replayed, say otherwise than the verdict that was issued,
// and otherwise than they said before: in or out of line, by series, date and range.
func differences(v View, b *Batch, names *Names, settings rules.Settings, decided map[valueAt]*rules.Act) ([]rules.Differs, error) {
	known, err := rangeIDs(v)
	if err != nil {
		return nil, err
	}
	c := &comparing{before: newReader(v, names), after: newReader(&replayed{v, b}, names), inForce: map[uint16]bool{}}
	for n := range settings.Ranges {
		c.inForce[known[settings.Identity(n)]] = true
	}
	since := map[uint32]rules.Date{}
	var series []uint32
	for at := range decided {
		if first, ok := since[at.series]; !ok {
			since[at.series] = at.date
			series = append(series, at.series)
		} else {
			since[at.series] = min(first, at.date)
		}
	}
	slices.Sort(series)
	for _, id := range series {
		if err := c.series(string(names.Name(id)), since[id]); err != nil {
			return nil, err
		}
	}
	return c.found, nil
}

// comparing holds the verdicts that windows give now against those they gave before a replay.
type comparing struct {
	before, after *Reader
	inForce       map[uint16]bool // ranges whose used values are kept up to date
	found         []rules.Differs
}

func (c *comparing) series(name string, since rules.Date) error {
	before, err := c.before.series(name)
	if err != nil {
		return err
	}
	after, err := c.after.series(name)
	if err != nil {
		return err
	}
	for n, at := range before.dates {
		if before.versions[at].Date <= since {
			continue
		}
		if err := c.date(before, after, n); err != nil {
			return err
		}
	}
	return nil
}

func (c *comparing) date(before, after *seriesPast, n int) error {
	v, _ := before.latest(n, ^uint32(0))
	set, err := c.before.settingsOf(v.Step)
	if err != nil {
		return err
	}
	before.group = set.members.Group(before.name)
	after.group = before.group
	now := v
	now.Step = ^uint32(0) // the windows as they are now, not as they were when the value came
	for k, rng := range set.Ranges {
		if rng.Limit != nil || !c.inForce[set.ids[k]] || !set.members.Applies(k, before.name, before.group) {
			continue
		}
		var issued, was, is Row
		for _, judged := range []struct {
			r   *Reader
			s   *seriesPast
			v   Version
			row *Row
		}{{c.before, before, now, &was}, {c.after, after, now, &is}, {c.before, before, v, &issued}} {
			judged.row.Return = rules.Units(v.Value)
			if err := judged.r.judge(judged.s, n, judged.v, set, k, judged.row, false); err != nil {
				return err
			}
		}
		if out(is) != out(issued) && out(is) != out(was) {
			c.found = append(c.found, rules.Differs{Series: before.name, Date: v.Date, Range: rng.Name, Issued: issued.Finding, Now: is.Finding})
		}
	}
	return nil
}

func out(r Row) bool { return r.Finding == rules.Breach }

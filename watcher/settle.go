package watcher

import (
	"bytes"

	"strayd/rules"
)

// leastLevel is the smallest tail probability that a budget is turned into: the data of a series supports nothing rarer.
const leastLevel = 0.0005

// settle records the settings when they are not those recorded last: as one step of its own, with the used values that they
// give to the flagged values already held. active is how many series there are, for lines stated as a budget.
func (p *Pass) settle(active int) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b, again, err := p.settingsStep(v, active)
	if err == nil && b != nil {
		err = p.replayAll(v, b, again)
	}
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil || b == nil {
		return err
	}
	return p.Store.Publish(b)
}

// settingsStep is the step that records new settings, nil when nothing changed. again lists the ranges whose used values nobody
// kept up to date under the settings before, or that are new.
func (p *Pass) settingsStep(v View, active int) (b *Batch, again []RangeKey, err error) {
	last, recorded, err := lastSettings(v)
	if err != nil {
		return nil, nil, err
	}
	resolveBudgets(&p.Settings, recorded, active)
	text := p.Settings.Text()
	unknown, again, err := p.newRanges(v, recorded)
	if err != nil || last > 0 && bytes.Equal(text, recorded.Text()) && len(unknown) == 0 {
		return nil, nil, err
	}
	b = &Batch{NewRanges: unknown, Step: v.Step() + 1, Settings: text}
	b.File = FileRow{Step: b.Step, Settings: last + 1, Outcome: Changed, Received: p.Now, First: rules.NoDate, Last: rules.NoDate}
	b.Record = []RecordEntry{{Kind: SettingsEntry, Who: p.Who, At: p.Now, Body: text}}
	return b, again, nil
}

// newRanges numbers the definitions that the ledger does not know, and lists those that need a replay.
func (p *Pass) newRanges(v View, recorded *rules.Settings) (unknown, again []RangeKey, err error) {
	known, err := rangeIDs(v)
	if err != nil {
		return nil, nil, err
	}
	keys := []string{concludedKey, residualKey}
	if p.termed() {
		keys = append(keys, termsKey)
	}
	for _, key := range keys {
		if known[key] == 0 {
			known[key] = uint16(len(known) + 1)
			unknown = append(unknown, RangeKey{known[key], key})
		}
	}
	kept := map[string]bool{}
	for n := range recorded.Ranges {
		if key := recorded.Identity(n); known[key] != 0 { // another version of the program may have written it otherwise
			kept[key] = true
		}
	}
	for n, r := range p.Settings.Ranges {
		key := p.Settings.Identity(n)
		if r.Limit != nil || kept[key] {
			continue
		}
		kept[key] = true
		id, ok := known[key]
		if !ok {
			id = uint16(len(known) + 1)
			known[key] = id
			unknown = append(unknown, RangeKey{id, key})
		}
		again = append(again, RangeKey{id, key})
	}
	return unknown, again, nil
}

// lastSettings is the number and content of the settings recorded last; 0 and empty ones in a new ledger.
func lastSettings(v View) (uint32, *rules.Settings, error) {
	last, err := v.LastSettings()
	if err != nil || last == 0 {
		return 0, &rules.Settings{}, err
	}
	text, err := v.Settings(last)
	if err != nil {
		return 0, nil, err
	}
	s, err := rules.ParseSettings(text)
	return last, s, err
}

func rangeIDs(v View) (map[string]uint16, error) {
	ranges, err := v.Ranges()
	if err != nil {
		return nil, err
	}
	ids := map[string]uint16{}
	for _, r := range ranges {
		ids[r.Key] = r.ID
	}
	return ids, nil
}

// resolveBudgets turns each line stated as a budget into a level: budget / (5 x active series x ranges), at least 0.05 %. A line
// that stands unchanged in the recorded settings keeps the level that it got there.
func resolveBudgets(s, recorded *rules.Settings, active int) {
	ranges := 0
	before := map[string]rules.Range{}
	for _, r := range recorded.Ranges {
		before[r.Name] = r
	}
	for _, r := range s.Ranges {
		if r.Limit == nil {
			ranges++
		}
	}
	for n := range s.Ranges {
		r := &s.Ranges[n]
		old := before[r.Name]
		r.Watch.Level = level(r.Watch.Budget, old.Watch, active*ranges)
		r.Breach.Level = level(r.Breach.Budget, old.Breach, active*ranges)
	}
}

// ResolveBudgets turns budget lines into levels for a number of series, as a first pass would.
func ResolveBudgets(s *rules.Settings, active int) { resolveBudgets(s, &rules.Settings{}, active) }

func level(budget float64, old rules.Line, judged int) float64 {
	switch {
	case budget == 0:
		return 0
	case old.Budget == budget && old.Level > 0:
		return old.Level
	case judged == 0:
		return 0
	}
	return min(max(budget/(5*float64(judged)), leastLevel), 0.5)
}

// replayAll brings ranges up to date with everything held, by a replay from the first date.
func (p *Pass) replayAll(v View, b *Batch, again []RangeKey) error {
	if len(again) == 0 {
		return nil
	}
	names, err := v.Names()
	if err != nil {
		return err
	}
	j := &judging{names: names, heldNames: names.Len(), firstNames: names.Len(), newest: rules.NoDate, now: p.Now, step: b.Step, nextRef: v.NextRef()}
	if err := p.prepare(j, v); err != nil || len(j.held) == 0 {
		return err
	}
	p.only(j, again)
	j.scales = newGroupScales(j, v, nil)
	if j.weighed, err = p.foreseeAll(j, v); err != nil {
		return err
	}
	outs, err := p.runTasks(j, tasks(allBlocks(names.Len(), j.held[0]), j.width))
	if err != nil {
		return err
	}
	p.assemble(b, j, outs)
	b.Scales, err = j.scales.stored()
	return err
}

// only leaves the ranges of the given definitions, with their new numbers, and the limits: a range without a number gets no lane.
func (p *Pass) only(j *judging, ranges []RangeKey) {
	ids := map[string]uint16{}
	for _, r := range ranges {
		ids[r.Key] = r.ID
	}
	for n := range j.gauges {
		j.ids[n] = ids[p.Settings.Identity(n)]
	}
}

func allBlocks(series int, since rules.Date) (out []block) {
	for n := 0; n*BlockSize < series; n++ {
		out = append(out, block{number: uint32(n), series: min(BlockSize, series-n*BlockSize), since: since})
	}
	return out
}

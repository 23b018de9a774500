package watcher

import (
	"bytes"
	"encoding/json"
	"fmt"

	"strayd/rules"
)

// leastLevel is the smallest tail probability that a budget is turned into: the data of a series supports nothing rarer.
const leastLevel = 0.0005

// RangeIdentity is the text that tells one definition of a range's windows from another: all that decides which used values
// they take. Ranges that differ only in name, in whom they judge or in the watch line share it.
func RangeIdentity(s *rules.Settings, n int) string {
	r := s.Ranges[n]
	r.Name, r.For, r.Watch = "", nil, rules.Line{}
	var limits []rules.Range
	for _, l := range s.Ranges {
		if l.Limit != nil {
			limits = append(limits, rules.Range{For: l.For, Limit: l.Limit})
		}
	}
	text, err := json.Marshal(struct {
		Range  rules.Range
		Limits []rules.Range
		Groups []string
	}{r, limits, groupsOf(s, limits)})
	if err != nil {
		panic(err) // plain values always encode
	}
	return string(text)
}

// groupsOf is the membership that the limits' `for` leans on; "" when they judge everything.
func groupsOf(s *rules.Settings, limits []rules.Range) (out []string) {
	for _, l := range limits {
		if len(l.For) > 0 {
			for _, g := range s.Groups {
				out = append(out, fmt.Sprint(g.Name, g.Series))
			}
			return append(out, s.Members)
		}
	}
	return nil
}

// settingsText is the text under which settings are recorded.
func settingsText(s *rules.Settings) []byte {
	text, err := json.Marshal(s)
	if err != nil {
		panic(err) // plain values always encode
	}
	return text
}

// ParseSettings reads a recorded settings text.
func ParseSettings(text []byte) (*rules.Settings, error) {
	s := new(rules.Settings)
	return s, json.Unmarshal(text, s)
}

// settle records the settings when they are not those recorded last: as one step of its own, with the used values that they
// give to the flagged values already held. active is how many series there are, for lines stated as a budget.
func (p *Pass) settle(active int) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b, err := p.settingsStep(v, active)
	if err == nil && b != nil {
		err = p.replayAll(v, b)
	}
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil || b == nil {
		return err
	}
	return p.Store.Publish(b)
}

// settingsStep is the step that records new settings, nil when nothing changed.
func (p *Pass) settingsStep(v View, active int) (*Batch, error) {
	last, err := v.LastSettings()
	if err != nil {
		return nil, err
	}
	var before []byte
	recorded := &rules.Settings{}
	if last > 0 {
		if before, err = v.Settings(last); err != nil {
			return nil, err
		}
		if recorded, err = ParseSettings(before); err != nil {
			return nil, fmt.Errorf("settings %d: %w", last, err)
		}
	}
	resolveBudgets(&p.Settings, recorded, active)
	text := settingsText(&p.Settings)
	if bytes.Equal(text, before) {
		return nil, nil
	}
	b := &Batch{Step: v.Step() + 1, Settings: text}
	b.File = FileRow{Step: b.Step, Settings: last + 1, Outcome: Changed, Received: p.Now, First: rules.NoDate, Last: rules.NoDate}
	b.Record = []RecordEntry{{Kind: "settings", Who: p.Who, At: p.Now, Body: text}}
	known, err := rangeIDs(v)
	if err != nil {
		return nil, err
	}
	for n, r := range p.Settings.Ranges {
		key := RangeIdentity(&p.Settings, n)
		if _, ok := known[key]; !ok && r.Limit == nil {
			known[key] = uint16(len(known) + 1)
			b.NewRanges = append(b.NewRanges, RangeKey{known[key], key})
		}
	}
	return b, nil
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

// replayAll gives a batch of new ranges the used values of everything held, by a replay from the first date. Only flagged
// values can differ from their returns, so a ledger without flags needs none.
func (p *Pass) replayAll(v View, b *Batch) error {
	if len(b.NewRanges) == 0 {
		return nil
	}
	names, err := v.Names()
	if err != nil {
		return err
	}
	j := &judging{names: names, heldNames: names.Len(), firstNames: names.Len(), now: p.Now, step: b.Step, nextRef: v.NextRef()}
	if err := p.prepare(j, v); err != nil || len(j.held) == 0 {
		return err
	}
	p.only(j, b.NewRanges)
	j.scales = newGroupScales(j, v, nil)
	outs, err := p.runTasks(j, tasks(allBlocks(names.Len()), j.width, j.held[0]))
	if err != nil {
		return err
	}
	for _, o := range outs {
		b.Used = append(b.Used, o.used...)
	}
	b.Used = joinUsed(b.Used)
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
		j.ids[n] = ids[RangeIdentity(&p.Settings, n)]
	}
}

func allBlocks(series int) (out []block) {
	for n := 0; n*BlockSize < series; n++ {
		out = append(out, block{number: uint32(n), series: min(BlockSize, series-n*BlockSize)})
	}
	return out
}

package watcher

import (
	"cmp"
	"slices"
	"sync"

	"strayd/rules"
	"strayd/stats"
)

// leastLenders is the fewest series that a group needs to lend its provisional members a deviation.
const leastLenders = 3

// groupScales are the deviations that groups lend to their provisional series in one step: on each date, the median over the
// group's series of the plain deviation of their returns as received, over the range's window before the date. Returns as
// received, not as used: so the figure does not wait for the verdicts of the same date, and a median bears the odd bad value.
// It is computed when first asked for, and stands from then on. Safe for concurrent use.
type groupScales struct {
	j      *judging
	view   View
	blocks map[uint32][]*day

	mu      sync.Mutex
	members map[string][]uint32 // series numbers by group
	known   map[scaleKey]GroupScale
	loaded  map[scaleKey]bool    // by range and group, without a date: what the ledger has of them is in known
	panels  map[int]*stats.Panel // by window
	sums    map[blockKey][]stats.Sums
	at      rules.Date // the date that sums belong to
	tails   map[scaleKey][]GroupScale
	err     error
}

type scaleKey struct {
	id    uint16
	group string
	date  rules.Date
}

type blockKey struct {
	window int
	block  uint32
}

// newGroupScales prepares the scales of a step.
func newGroupScales(j *judging, v View, blocks []block) *groupScales {
	g := &groupScales{j: j, view: v, blocks: map[uint32][]*day{}, known: map[scaleKey]GroupScale{}, loaded: map[scaleKey]bool{}, panels: map[int]*stats.Panel{},
		tails: map[scaleKey][]GroupScale{}}
	for _, b := range blocks {
		g.blocks[b.number] = b.days
	}
	return g
}

// lent is the deviation of a group on a date; absent where too few of its series have one.
func (g *groupScales) lent(l *lane, group string, date rules.Date) rules.Num {
	if group == "" {
		return rules.Num{}
	}
	g.mu.Lock()
	defer g.mu.Unlock()
	key := scaleKey{l.id, group, date}
	g.recall(scaleKey{l.id, group, rules.NoDate})
	s, ok := g.known[key]
	if !ok {
		s = g.compute(key, l.gauge.Range.Window)
		g.known[key] = s
	}
	if s.Series < leastLenders {
		return rules.Num{}
	}
	return rules.Some(s.Deviation)
}

// recall reads what was lent before: what a date's first verdict was given stands.
func (g *groupScales) recall(all scaleKey) {
	if g.loaded[all] {
		return
	}
	g.loaded[all] = true
	scales, err := g.view.GroupScales(all.id, all.group)
	if err != nil {
		g.err = err
	}
	for _, s := range scales {
		g.known[scaleKey{s.Range, s.Group, s.Date}] = s
	}
}

func (g *groupScales) compute(key scaleKey, window int) GroupScale {
	if g.members == nil {
		g.findMembers()
	}
	if g.at != key.date || g.sums == nil {
		g.sums, g.at = map[blockKey][]stats.Sums{}, key.date
	}
	var deviations []float64
	for _, id := range g.members[key.group] {
		sums, err := g.block(blockKey{window, id / BlockSize})
		if err != nil {
			g.err = err
			break
		}
		s := sums[id%BlockSize]
		if d, ok := s.Deviation(float64(rules.One)); ok && d > 0 && s.N >= rules.LeastJudged {
			deviations = append(deviations, d)
		}
	}
	median, _ := stats.Median(deviations)
	return GroupScale{Range: key.id, Group: key.group, Date: key.date, Step: g.j.step, Deviation: median, Series: uint32(len(deviations))}
}

func (g *groupScales) findMembers() {
	g.members = map[string][]uint32{}
	for id := range uint32(g.j.names.Len()) {
		if group := g.j.members.Group(string(g.j.names.Name(id))); group != "" {
			g.members[group] = append(g.members[group], id)
		}
	}
}

// block is the exact sums of the returns as received of every series of a block before the date at hand.
func (g *groupScales) block(key blockKey) ([]stats.Sums, error) {
	if sums, ok := g.sums[key]; ok {
		return sums, nil
	}
	panel := g.panels[key.window]
	if panel == nil {
		panel = stats.NewPanel(BlockSize, key.window)
		g.panels[key.window] = panel
	}
	panel.Reset()
	if err := g.load(panel, key); err != nil {
		return nil, err
	}
	sums := make([]stats.Sums, BlockSize)
	for i := range sums {
		sums[i] = panel.Sums(i)
	}
	g.sums[key] = sums
	return sums, nil
}

// load fills a panel from the dates before the one at hand, newest first.
func (g *groupScales) load(panel *stats.Panel, key blockKey) error {
	l := &lane{gauge: &rules.Gauge{Range: rules.Range{Window: key.window}}, last: make([]rules.Date, BlockSize)}
	b := newBackward(l, panel, g.at, BlockSize)
	days := g.blocks[key.block]
	n, _ := slices.BinarySearchFunc(days, g.at, func(d *day, at rules.Date) int { return cmp.Compare(d.date, at) })
	days = days[:n]
	held := g.j.heldBefore(key.block, g.at)
	raw := make([]int64, BlockSize)
	for b.open > 0 && len(days)+len(held) > 0 {
		var date rules.Date
		fillMissing(raw)
		if len(held) > 0 && (len(days) == 0 || held[len(held)-1] >= days[len(days)-1].date) {
			date = held[len(held)-1]
			held = held[:len(held)-1]
			if _, err := g.view.Fill(Returns, date, key.block, 0, raw); err != nil {
				return err
			}
		}
		if n := len(days) - 1; n >= 0 && days[n].date >= date {
			date = days[n].date
			overlay(raw, days[n].col, rules.Places)
			days = days[:n]
		}
		outsize(raw)
		b.take(date, raw)
	}
	return nil
}

// stored lists what was lent, for the ledger.
func (g *groupScales) stored() (out []GroupScale, err error) {
	for _, s := range g.known {
		if s.Series >= leastLenders && s.Step == g.j.step {
			out = append(out, s)
		}
	}
	slices.SortFunc(out, func(x, y GroupScale) int {
		return cmp.Or(cmp.Compare(x.Range, y.Range), cmp.Compare(x.Group, y.Group), cmp.Compare(x.Date, y.Date))
	})
	return out, g.err
}

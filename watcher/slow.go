package watcher

import (
	"cmp"
	"context"
	"fmt"
	"slices"
	"time"

	"strayd/rules"
)

// mostLone is how many series without group and reference a week's slow-burn checks look at, so that a million of them do not hold up the
// pass that makes the checks. The pass says when there are more.
const mostLone = 2 * BlockSize

// slowPast is what the ledger says of the slow-burn checks of before.
type slowPast struct {
	began   time.Time  // when the first file was accepted; the pass's own time when none was
	checked rules.Date // the Monday of the newest week that was checked
	any     bool
}

func (s *slowPast) note(r FileRow) {
	switch {
	case r.Outcome == Accepted && r.Received.Before(s.began):
		s.began = r.Received
	case r.Outcome == Checked:
		s.checked, s.any = rules.MondayOf(r.First), true
	}
}

// EndWeek makes the slow-burn checks of the week that ended last where no pass has made them yet, so that the weekly log has them.
func (p *Pass) EndWeek(ctx context.Context) error {
	if _, err := p.begin(); err != nil {
		return err
	}
	if err := p.slowBurn(ctx); err != nil {
		return fmt.Errorf("slow-burn checks: %w", err)
	}
	p.Resident.giveBack(p.names)
	return nil
}

// slowBurn makes the slow-burn checks of the week that ended last, once, as a step of its own. A week that was over when the ledger began is
// history, and so are weeks in which no pass came.
func (p *Pass) slowBurn(ctx context.Context) error {
	monday := rules.MondayOf(p.today()) - 7
	zone := cmp.Or(p.Zone, time.UTC)
	if p.slow.any && p.slow.checked >= monday || !p.slow.began.Before(rules.Instant((monday+7).Time(), zone)) {
		return nil
	}
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b, err := p.slowStep(ctx, v, monday)
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil || b == nil {
		return err
	}
	if err := p.Store.Publish(b); err != nil {
		return err
	}
	p.Resident.passed(b.Step)
	p.slow.checked, p.slow.any = monday, true
	p.row.Counts.Flags += b.File.Counts.Flags
	p.report(FileReport{Fate: FateChecked, Why: b.File.Reason, Row: b.File})
	return nil
}

// slowStep is the step of a week's checks; nil where the week has no values, or too few are held for any check.
func (p *Pass) slowStep(ctx context.Context, v View, monday rules.Date) (*Batch, error) {
	j := &judging{names: p.names, heldNames: p.names.Len(), now: p.Now, step: v.Step() + 1}
	if err := p.prepare(j, v); err != nil {
		return nil, err
	}
	end, _ := slices.BinarySearch(j.held, monday+7)
	if end <= rules.SlowLeast || j.held[end-1] < monday {
		return nil, nil
	}
	s := &slowScan{pass: p, j: j, view: v, monday: monday, dates: j.held[max(0, end-rules.SlowReach):end]}
	if err := s.scan(ctx); err != nil {
		return nil, err
	}
	b := &Batch{Step: j.step, Flags: s.flags, Scales: s.tails(j.held[len(j.held)-1], j.step)}
	for n, f := range b.Flags {
		f.Ref, f.Step = v.NextRef()+uint64(n), b.Step
	}
	b.File = FileRow{Step: b.Step, Settings: j.settings, Outcome: Checked, Received: p.Now, Reason: s.words(), First: monday,
		Last: s.dates[len(s.dates)-1], Counts: Counts{Flags: len(b.Flags)}}
	return b, nil
}

// slowScan makes the checks of one week.
type slowScan struct {
	pass   *Pass
	j      *judging
	view   View
	monday rules.Date
	dates  []rules.Date
	lone   int // series without group and reference
	looked int
	told   map[slowKey]*rules.Flag // the newest flag of each; nil until one is asked for
	flags  []*FlagRow

	returns, residuals []int64 // of one block: date by date
	raw                []int64 // returns as received, but for errors; nil where no tail is learnt
	counts             map[scaleKey]*rules.Exceedances
	uses               []int64        // of one date
	seen               rules.SlowPast // of one series
	left               []float64      // its residuals, where it has any
}

type slowKey struct {
	series string
	kind   rules.Kind
}

// words say what was looked at.
func (s *slowScan) words() string {
	w := fmt.Sprintf("slow-burn checks of week %s: %s looked at, %s for the weekly log", rules.WeekName(s.monday),
		rules.Counted(s.looked, "series"), rules.Counted(len(s.flags), "flag"))
	if s.lone > mostLone {
		w += fmt.Sprintf("; of %s series without group and reference only the first %s; give a series a group to have it looked at",
			rules.Thousands(s.lone), rules.Thousands(mostLone))
	}
	return w
}

// scan goes through the series by block.
func (s *slowScan) scan(ctx context.Context) error {
	chosen := s.chosen()
	s.uses = make([]int64, BlockSize)
	for from := 0; from < len(chosen); {
		if err := ctx.Err(); err != nil {
			return err
		}
		block, to := chosen[from]/BlockSize, from+1
		for to < len(chosen) && chosen[to]/BlockSize == block {
			to++
		}
		if err := s.block(block, chosen[from:to]); err != nil {
			return err
		}
		from = to
	}
	return nil
}

// chosen are the series that are looked at, ascending: all that have a group or a reference, and the first of the others. Those in their
// first load have no week yet.
func (s *slowScan) chosen() (out []uint32) {
	m, names := s.j.members, min(s.pass.firstNames, s.j.names.Len())
	alone := m.Lone()
	for id := range uint32(names) {
		if !alone {
			name := string(s.j.names.Name(id))
			if g := m.Group(name); g != "" || m.Reference(name, g) != "" {
				out = append(out, id)
				continue
			}
		}
		if s.lone++; s.lone <= mostLone {
			out = append(out, id)
		}
	}
	return out
}

// block checks the chosen series of one block.
func (s *slowScan) block(number uint32, chosen []uint32) error {
	if size := len(s.dates) * BlockSize; s.returns == nil {
		s.returns, s.residuals = make([]int64, size), make([]int64, size)
		if s.j.learns() {
			s.raw, s.counts = make([]int64, size), map[scaleKey]*rules.Exceedances{}
		}
	}
	for n := range s.dates {
		if err := s.read(n, number); err != nil {
			return err
		}
	}
	for _, id := range chosen {
		if err := s.series(id); err != nil {
			return err
		}
	}
	return nil
}

// series checks one series and raises what is new.
func (s *slowScan) series(id uint32) error {
	past, newest := s.past(int(id % BlockSize))
	if newest < s.monday {
		return nil
	}
	s.looked++
	var failed error
	name := string(s.j.names.Name(id))
	if s.raw != nil {
		s.count(id, name)
	}
	news := past.News(s.monday+6, func(k rules.Kind) *rules.Flag {
		f, err := s.toldOf(name, k)
		if err != nil {
			failed = err
		}
		return f
	})
	for _, n := range news {
		s.flags = append(s.flags, s.flag(id, name, newest, n, past.Residuals != nil))
	}
	return failed
}

// toldOf is the newest flag of a series and kind, nil for none.
func (s *slowScan) toldOf(series string, kind rules.Kind) (*rules.Flag, error) {
	if s.told == nil {
		s.told = map[slowKey]*rules.Flag{}
		takes := func(h FlagHead) bool { return h.Kind.Slow() }
		if err := s.view.FlagsOf(true, takes, func(f rules.Flag) bool {
			s.told[slowKey{f.Series, f.Kind}] = &f
			return true
		}); err != nil {
			return nil, err
		}
	}
	return s.told[slowKey{series, kind}], nil
}

func (s *slowScan) flag(id uint32, name string, date rules.Date, f rules.SlowFinding, referenced bool) *FlagRow {
	row := &FlagRow{SeriesID: id, New: true, WindowTo: rules.NoDate, Used: rules.Missing}
	row.RaisedAt, row.Date, row.Series, row.Group = s.j.now, date, name, s.j.members.Group(name)
	row.Kind, row.Standing, row.Return, row.Note = f.Kind, rules.Open, rules.Missing, f.Note
	if referenced {
		row.Reference = s.j.members.Reference(name, row.Group)
	}
	return row
}

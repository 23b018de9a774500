package watcher

import (
	"fmt"
	"slices"
	"time"

	"strayd/rules"
)

// UnknownRef is the error for a ref that no flag has.
type UnknownRef struct{ Ref uint64 }

func (e *UnknownRef) Error() string {
	return fmt.Sprintf("no flag has the ref %d; `strayd flags --all` lists them", e.Ref)
}

// Answer is what an act brought about.
type Answer struct {
	Entry rules.Entry
	Flags []rules.Flag // as they stand now, by ref
	Notes []string
}

// Act carries out what a person does about some flags: all of it as one step, with the used values that follow from it and its entry in
// the record, or nothing. By whom and what stand in the act; step and time are given here.
func (p *Pass) Act(refs []uint64, act rules.Act) (*Answer, error) {
	if err := act.Check(); err != nil {
		return nil, err
	}
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	d := &deciding{p: p, view: v, act: act, flags: map[uint64]*rules.Flag{}}
	b, err := d.step(refs)
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil {
		return nil, err
	}
	if err := p.Store.Publish(b); err != nil {
		return nil, err
	}
	if len(b.Used)+len(b.States) == 0 {
		p.Resident.passed(b.Step)
	}
	return &d.answer, nil
}

// deciding is one act on its way into the ledger.
type deciding struct {
	p      *Pass
	view   View
	act    rules.Act
	flags  map[uint64]*rules.Flag // as they stand after the act
	answer Answer
}

// step is the step that records the act.
func (d *deciding) step(refs []uint64) (*Batch, error) {
	refs = slices.Clone(refs)
	slices.Sort(refs)
	refs = slices.Compact(refs)
	b := &Batch{Step: d.view.Step() + 1}
	d.act.Step, d.act.At = b.Step, d.p.Now
	d.answer.Entry = rules.Entry{Act: d.act, Refs: refs}
	settings, err := d.view.LastSettings()
	if err != nil {
		return nil, err
	}
	b.File = FileRow{Step: b.Step, Settings: settings, Outcome: Acted, Received: d.p.Now, First: rules.NoDate, Last: rules.NoDate}
	if err := d.ofWaivers(refs); err != nil {
		return nil, err
	}
	for _, ref := range refs {
		if err := d.one(ref); err != nil {
			return nil, err
		}
	}
	if d.act.Deed == rules.Decide {
		if err := d.conclude(b); err != nil {
			return nil, err
		}
	}
	b.Record = []RecordEntry{entryOf(&d.answer.Entry)}
	if err := d.put(b); err != nil {
		return nil, err
	}
	b.Notices = d.p.tellActs(&d.answer)
	return b, nil
}

// ofWaivers gives the sign-off of waivers their last day. One act has one: waivers of several, and decisions, are signed off apart.
func (d *deciding) ofWaivers(refs []uint64) error {
	if d.act.Deed != rules.SignOff {
		return nil
	}
	for n, ref := range refs {
		f, ok, err := d.view.Flag(ref)
		if err != nil {
			return err
		}
		until := rules.NoDate
		if ok && f.StandingOn(d.p.today()) == rules.Waived && f.AwaitsSecond() {
			until = f.Last.Until
		}
		if n > 0 && until != d.act.Until {
			return fmt.Errorf("flags %d and %d are waived until different days, or one is decided: sign them off apart", refs[0], ref)
		}
		d.act.Until = until
	}
	d.answer.Entry.Act = d.act
	return nil
}

// tellActs makes the updates of an act.
func (p *Pass) tellActs(a *Answer) []rules.Notice {
	if p.TellActs == nil {
		return nil
	}
	return p.TellActs(rules.ActNews{Act: a.Entry.Act, Flags: a.Flags})
}

// put puts the flags as they now stand into the batch.
func (d *deciding) put(b *Batch) error {
	names, err := d.view.Names()
	if err != nil {
		return err
	}
	for _, ref := range d.answer.Entry.Refs {
		f := flagRow(names, *d.flags[ref])
		b.Flags = append(b.Flags, f)
		d.answer.Flags = append(d.answer.Flags, f.Flag)
	}
	return nil
}

// one lets the act take effect on one flag.
func (d *deciding) one(ref uint64) error {
	f, ok, err := d.view.Flag(ref)
	if err != nil {
		return err
	}
	if !ok {
		return &UnknownRef{ref}
	}
	if err := d.p.inTurn(&f); err != nil {
		return err
	}
	a := d.act
	a.Second = d.p.fourEyes(f.Group) || d.act.Deed == rules.SignOff && f.AwaitsSecond()
	if a.Second {
		d.answer.Entry.Second = append(d.answer.Entry.Second, ref)
	}
	if a.Reason == rules.MarketMove && a.Override == "" {
		if err := d.isMarket(&f); err != nil {
			return err
		}
	}
	f, err = f.After(&a, d.p.today())
	d.flags[ref] = &f
	return err
}

// inTurn refuses an act on a day before the flag was raised, or before what was done about it last: the record tells a story in order.
func (p *Pass) inTurn(f *rules.Flag) error {
	last, what := f.RaisedAt, "it was raised"
	if f.Last != nil && f.Last.At.After(last) {
		last, what = f.Last.At, "something was done about it last"
	}
	if day := rules.DateFrom(last.In(p.zone())); p.today() < day {
		return fmt.Errorf("flag %d: %s lies before %s, when %s", f.Ref, p.today(), day, what)
	}
	return nil
}

// fourEyes says whether a group asks for a second person.
func (p *Pass) fourEyes(group string) bool {
	return group != "" && slices.ContainsFunc(p.Settings.Groups, func(g rules.Group) bool { return g.Name == group && g.FourEyes })
}

// today is the day of the pass in its zone.
func (p *Pass) today() rules.Date {
	return rules.DateFrom(p.Now.In(p.zone()))
}

func (p *Pass) zone() *time.Location {
	if p.Zone == nil {
		return time.UTC
	}
	return p.Zone
}

// entryOf is an entry as the record takes it.
func entryOf(e *rules.Entry) RecordEntry {
	return RecordEntry{Kind: DecisionEntry, Who: e.By.String(), At: e.At, Body: e.Text()}
}

// isMarket is the error of a market move that the residual does not bear out. Where no residual range judged the return, that it looks like the
// market is enough.
func (d *deciding) isMarket(f *rules.Flag) error {
	if f.Kind == rules.KindMarketDay {
		return nil
	}
	why := "the flag is about no return"
	if f.Series != "" {
		r, err := NewReader(d.view)
		if err != nil {
			return err
		}
		judged, because, err := r.residualOutside(f)
		if err != nil || because == "" || !judged && f.LooksLike == rules.CauseMarket {
			return err
		}
		why = because
	}
	return fmt.Errorf("flag %d is no market move: %s; give another reason, or say with an override note why it is one", f.Ref, why)
}

// residualOutside says why what the reference leaves unexplained of a flagged return is not known to be in range, "" when it is; judged says
// whether a residual range judged it at all.
func (r *Reader) residualOutside(f *rules.Flag) (judged bool, why string, err error) {
	rows, _, err := r.At(f.Series, f.Date, f.Step)
	if err != nil {
		return false, "", err
	}
	for _, row := range rows {
		if row.Of != rules.Residual || row.Limited || row.Finding == rules.NotJudged {
			continue
		}
		if judged = true; row.Finding == rules.Breach {
			return true, fmt.Sprintf("what its reference leaves unexplained is out of range %q", row.Range), nil
		}
	}
	if !judged {
		why = "no residual range judged it, so nothing says that the market explains it"
	}
	return judged, why, nil
}

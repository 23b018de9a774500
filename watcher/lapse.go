package watcher

import "strayd/rules"

// lapse opens the flags again whose waiver has run out, as one step of its own.
func (p *Pass) lapse() error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b, err := p.lapseStep(v)
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil || b == nil {
		return err
	}
	p.tell(b, 0)
	err = p.Store.Publish(b)
	if err == nil {
		p.Resident.passed(b.Step)
	}
	return err
}

// lapseStep is the step that ends waivers, nil when none has run out.
func (p *Pass) lapseStep(v View) (*Batch, error) {
	var over []rules.Flag
	today := p.today()
	waived := func(h FlagHead) bool { return h.Standing == rules.Waived }
	if err := v.FlagsOf(false, waived, func(f rules.Flag) bool {
		if f.StandingOn(today) != rules.Waived {
			over = append(over, f)
		}
		return true
	}); err != nil || len(over) == 0 {
		return nil, err
	}
	names, err := v.Names()
	if err != nil {
		return nil, err
	}
	settings, err := v.LastSettings()
	if err != nil {
		return nil, err
	}
	b := &Batch{Step: v.Step() + 1}
	b.File = FileRow{Step: b.Step, Settings: settings, Outcome: Lapsed, Received: p.Now, First: rules.NoDate, Last: rules.NoDate}
	for _, f := range over {
		f.Standing, f.Note = rules.Reopened, join(f.Note, "waived until "+f.Last.Until.String()+", which is over")
		row := flagRow(names, f)
		row.Reopens = true
		b.Flags = append(b.Flags, row)
	}
	return b, nil
}

// flagRow is a flag that is held, with the number of its series.
func flagRow(names *Names, f rules.Flag) *FlagRow {
	row := &FlagRow{Flag: f, SeriesID: NoSeries, WindowTo: rules.NoDate, Used: rules.Missing}
	if id, ok := names.Find([]byte(f.Series)); ok && f.Series != "" {
		row.SeriesID = id
	}
	return row
}

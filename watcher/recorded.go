package watcher

import (
	"time"

	"strayd/rules"
)

// settingsOf is the settings under which a step judged.
func (r *Reader) settingsOf(step uint32) (*recorded, error) {
	row, err := r.File(step)
	if err != nil {
		return nil, err
	}
	return r.settingsNumber(row.Settings)
}

// File is the file row of a step.
func (r *Reader) File(step uint32) (FileRow, error) {
	if row, ok := r.files[step]; ok {
		return row, nil
	}
	row, err := r.View.File(step)
	if err == nil {
		r.files[step] = row
	}
	return row, err
}

// settingsNumber makes a recorded settings text ready.
func (r *Reader) settingsNumber(id uint32) (*recorded, error) {
	if s, ok := r.settings[id]; ok {
		return s, nil
	}
	text, err := r.View.Settings(id)
	if err != nil {
		return nil, err
	}
	parsed, err := rules.ParseSettings(text)
	if err != nil {
		return nil, err
	}
	s, err := r.ready(parsed)
	if err == nil {
		r.settings[id] = s
	}
	return s, err
}

func (r *Reader) ready(parsed *rules.Settings) (*recorded, error) {
	s := &recorded{Settings: parsed}
	ids, err := rangeIDs(r.View)
	if err != nil {
		return nil, err
	}
	if s.members, err = rules.NewMembership(parsed); err != nil {
		return nil, err
	}
	s.residuals, s.terms = ids[residualKey], ids[termsKey]
	for n, rng := range parsed.Ranges {
		g, err := rules.NewGauge(rng)
		if err != nil {
			return nil, err
		}
		s.gauges = append(s.gauges, g)
		s.ids = append(s.ids, ids[parsed.Identity(n)])
	}
	return s, nil
}

// Received is when the file of a step arrived.
func (r *Reader) Received(step uint32) (time.Time, error) {
	row, err := r.File(step)
	return row.Received, err
}

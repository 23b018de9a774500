package main

import (
	"fmt"
	"maps"
	"path/filepath"
	"slices"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher/calendar"
)

// nameDays reads the business days of every calendar that the configuration and the register name. Files lie beside the
// configuration.
func nameDays(c *config.Config, s *rules.Settings) error {
	place := func(name string) string {
		if filepath.IsAbs(name) {
			return name
		}
		return filepath.Join(filepath.Dir(c.File), name)
	}
	s.Calendars = map[string]*rules.Calendar{}
	if !calendar.Plain(s.Calendar) {
		s.Calendars[s.Calendar] = c.Calendar.Days
	}
	for _, name := range slices.Compact(slices.Sorted(maps.Values(s.CalendarOf))) {
		if calendar.Plain(name) || s.Calendars[name] != nil {
			continue
		}
		days, err := calendar.Parse(name, place)
		if err != nil {
			return fmt.Errorf("%s: %w", c.File, err)
		}
		s.Calendars[name] = days
	}
	return nil
}

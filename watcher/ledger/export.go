package ledger

import (
	"strayd/rules"
	"strayd/watcher"
)

// Values calls each with the newest value of every date and series, by date, then series number, until it returns an error,
// which comes back. Values are at w.Places() decimals.
func (v *View) Values(w watcher.What, each func(date rules.Date, series uint32, value int64) error) error {
	dates, err := v.Dates(w)
	if err != nil {
		return err
	}
	cells := make([]int64, watcher.BlockSize)
	for _, date := range dates {
		for block := uint32(0); block*watcher.BlockSize < v.head.names; block++ {
			held, err := v.Fill(w, date, block, 0, cells)
			if err != nil {
				return err
			}
			if !held {
				continue
			}
			if err := eachCell(date, block, cells, each); err != nil {
				return err
			}
		}
	}
	return nil
}

func eachCell(date rules.Date, block uint32, cells []int64, each func(rules.Date, uint32, int64) error) error {
	for i, value := range cells {
		if value == watcher.Missing64 {
			continue
		}
		if err := each(date, block*watcher.BlockSize+uint32(i), value); err != nil {
			return err
		}
	}
	return nil
}

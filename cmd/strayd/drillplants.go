package main

import (
	"errors"
	"os"
	"strconv"

	"strayd/rules"
	"strayd/rules/drill"
)

const plantColumns = "seed,kind,series,group,partner,feed,date,days,left,within,looks_like,named,flags,followed"

// listPlants writes every plant with what became of it into a file, as CSV.
func (d *driller) listPlants(path string) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	l, err := newListing(f, "csv", plantColumns)
	if err == nil {
		for _, r := range d.rounds {
			for _, o := range drill.Outcomes(d.book, r.plan, r.flags) {
				err = errors.Join(err, l.row(d.plantCells(r.plan.Seed, &o)...))
			}
		}
		err = errors.Join(err, l.end())
	}
	return errors.Join(err, f.Close())
}

// plantCells are the columns of a plant. within is the number of dates from the one on which it shows to the one on which it was
// caught, empty where it was not in time; left is in residual deviations.
func (d *driller) plantCells(seed uint64, o *drill.Outcome) []cell {
	group, within, left := null, null, null
	if o.Series >= 0 {
		group = text(d.book.Series[o.Series].Group)
	}
	if o.FiveDays() {
		within = integer(o.Within)
	}
	if o.Left > 0 {
		left = number(rules.Some(o.Left))
	}
	named := map[drill.Naming]string{drill.Right: "right", drill.Wrong: "wrong"}[o.Naming]
	return []cell{text(strconv.FormatUint(seed, 10)), text(string(o.Kind)), d.seriesCell(o.Series), group, d.seriesCell(o.Partner), text(o.Feed),
		date(d.book.Dates[o.At]), integer(o.Days), left, within, text(string(o.Named)), text(named), integer(o.Flags), integer(o.Followed)}
}

func (d *driller) seriesCell(at int) cell {
	if at < 0 {
		return null
	}
	return text(d.book.Series[at].ID)
}

package drill

// Floor is one row of the table that the default settings are held to, on invented books.
type Floor struct {
	Name  string
	Lasts bool // caught within five days rather than on the day
	// In per cent, 0 where nothing is asked: caught; named rightly and at most wrongly, of those caught; caught with a single flag.
	Caught, Right, Wrong, Single float64
	Followed                     float64 // at most, flags on followers a day
	takes                        func(*Outcome, *Series) bool
}

// fine and coarse are the decimals; tight and loose the residual deviations of an invented series.
func fine(s *Series) bool   { return s.Fine() }
func coarse(s *Series) bool { return !s.Fine() }
func tight(s *Series) bool  { return s.Residual > 0 && s.Residual < 0.002 }
func loose(s *Series) bool  { return s.Residual >= 0.002 }

func of(k Kind, also ...func(*Series) bool) func(*Outcome, *Series) bool {
	return func(o *Outcome, s *Series) bool {
		if o.Kind != k {
			return false
		}
		for _, is := range also {
			if !is(s) {
				return false
			}
		}
		return true
	}
}

// plainly says that what is planted leaves over 5 residual deviations.
func plainly(o *Outcome, _ *Series) bool { return o.Kind == Sign && o.Left > 5 }

var floors = []Floor{
	{Name: "x100 row", Caught: 96, Right: 86, takes: of(X100)},
	{Name: "x100 file", Caught: 99.5, Right: 99, Single: 99.5, takes: of(X100File)},
	{Name: "1/100 file", Caught: 99.5, Right: 99, Single: 99.5, takes: of(Div100File)},
	{Name: "1/100 row", Caught: 55, Right: 75, takes: of(Div100)},
	{Name: "1/100 row, four decimals", Right: 95, takes: of(Div100, fine)},
	{Name: "sign, over 5 residual deviations", Caught: 95, Right: 88, takes: plainly},
	{Name: "repeat, four decimals", Caught: 99.5, Right: 98, takes: of(Repeat, fine)},
	{Name: "repeat, two decimals", Caught: 72, Right: 96, takes: of(Repeat, coarse)},
	{Name: "false zero, four decimals", Caught: 99.5, Right: 98, takes: of(Zero, fine)},
	{Name: "false zero, two decimals", Caught: 60, Right: 95, takes: of(Zero, coarse)},
	{Name: "missed 0.8 % distribution, listed, residual 0.15", Caught: 97, Right: 98, takes: of(MissedListed, tight)},
	{Name: "the same, residual 0.3", Caught: 85, Right: 97, takes: of(MissedListed, loose)},
	{Name: "the same, not listed, residual 0.15", Caught: 75, Wrong: 20, takes: of(MissedNot, tight)},
	{Name: "distribution doubled, listed", Caught: 87, Right: 96, takes: of(Doubled)},
	{Name: "split", Caught: 99.5, Right: 95, takes: of(Split)},
	{Name: "split, listed", Caught: 99.5, Right: 99, takes: of(SplitListed)},
	{Name: "x10,000", Caught: 99.5, Right: 97, takes: of(X10000)},
	{Name: "x10", Caught: 78, Wrong: 5, takes: of(X10)},
	{Name: "spike and reversal, second day", Caught: 98, Right: 97, takes: of(Spike)},
	{Name: "date shifted for a file, five days", Lasts: true, Caught: 98, Right: 95, takes: of(ShiftedFile)},
	{Name: "the same, a day early", Lasts: true, takes: of(EarlyFile)},
	{Name: "swapped with another group, five days", Lasts: true, Caught: 90, Right: 95, takes: of(Swapped)},
	{Name: "cumulative, five days", Lasts: true, Caught: 75, Right: 93, takes: of(Cumulative)},
	{Name: "currency missing, five days", Lasts: true, takes: of(FXMissing)},
	{Name: "currency twice, five days", Lasts: true, takes: of(FXTwice)},
	{Name: "reference wrong", Caught: 95, Right: 95, Followed: 0.3, takes: of(ReferenceBad)},
	{Name: "truncated file", Caught: 100, Single: 100, takes: of(TruncatedFile)},
	{Name: "missing file", Caught: 100, Single: 100, takes: of(MissingFile)},
	{Name: "late file", Caught: 100, Single: 100, takes: of(LateFile)},
	{Name: "true 6-deviation move", Caught: 97, Wrong: 5, takes: of(Move)},
	{Name: "ten days after an undecided x100", Caught: 95, Wrong: 5, takes: of(MoveAfter)},
}

// Floors lists the rows of the table.
func Floors() []Floor { return floors }

// Count counts the outcomes of a book that a row is about.
func (f *Floor) Count(b *Book, all []Outcome) Row {
	r := Row{Name: f.Name}
	none := Series{}
	for i := range all {
		s := &none
		if all[i].Series >= 0 {
			s = &b.Series[all[i].Series]
		}
		if f.takes(&all[i], s) {
			r.Add(&all[i])
		}
	}
	return r
}

// CaughtIn is the count that the row's figure for caught is about.
func (f *Floor) CaughtIn(r *Row) int {
	if f.Lasts {
		return r.FiveDays
	}
	return r.SameDay
}

// Sum adds the counts of several books under the same row.
func (r *Row) Sum(o Row) {
	r.Name = o.Name
	r.Planted += o.Planted
	r.SameDay += o.SameDay
	r.FiveDays += o.FiveDays
	r.Right += o.Right
	r.Wrong += o.Wrong
	r.Not += o.Not
	r.Single += o.Single
	r.Flags += o.Flags
	r.Followed += o.Followed
}

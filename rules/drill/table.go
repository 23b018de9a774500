package drill

// Row is one line of the scored table.
type Row struct {
	Name                                                  string
	Planted, SameDay, FiveDays, Right, Wrong, Not, Single int
	Flags, Followed                                       int
}

// Add counts an outcome.
func (r *Row) Add(o *Outcome) {
	r.Planted++
	r.Flags += o.Flags
	r.Followed += o.Followed
	if o.SameDay() {
		r.SameDay++
	}
	if !o.FiveDays() {
		return
	}
	r.FiveDays++
	if o.Flags == 1 {
		r.Single++
	}
	if natureOf(o.Kind).right == nil {
		return
	}
	switch o.Naming {
	case Right:
		r.Right++
	case Wrong:
		r.Wrong++
	default:
		r.Not++
	}
}

// Share is a count as a share of another; ok is false when there is nothing to share.
func Share(n, of int) (share float64, ok bool) {
	if of == 0 {
		return 0, false
	}
	return float64(n) / float64(of), true
}

// ByKind counts outcomes by kind, in the order of Kinds; kinds that were not planted are left out.
func ByKind(all []Outcome) []Row {
	rows := make([]Row, len(natures))
	for i := range all {
		for n := range natures {
			if natures[n].kind == all[i].Kind {
				rows[n].Name = string(all[i].Kind)
				rows[n].Add(&all[i])
			}
		}
	}
	return planted(rows)
}

func planted(rows []Row) (out []Row) {
	for _, r := range rows {
		if r.Planted > 0 {
			out = append(out, r)
		}
	}
	return out
}

// SplitBy counts the outcomes that are about one series by a word of the series, in the order in which the words first occur in the
// book: by group, or by what the series are held against.
func SplitBy(b *Book, all []Outcome, word func(*Series) string) []Row {
	at := map[string]int{}
	var rows []Row
	for i := range b.Series {
		w := word(&b.Series[i])
		if _, ok := at[w]; !ok {
			at[w] = len(rows)
			rows = append(rows, Row{Name: w})
		}
	}
	for i := range all {
		if o := &all[i]; o.Series >= 0 {
			rows[at[word(&b.Series[o.Series])]].Add(o)
		}
	}
	return planted(rows)
}

package main

import (
	"cmp"
	"fmt"
	"slices"

	"strayd/rules"
	"strayd/rules/drill"
)

const drillColumns = "by,name,planted,same_day,five_days,right,wrong,not_named,single,flags,followed,values,promised"

// promisesOf are what the lines of the settings promise of ordinary values.
func promisesOf(s rules.Settings, b *drill.Book) (out []drill.Promise, err error) {
	members, err := rules.NewMembership(&s)
	if err != nil {
		return nil, err
	}
	for n, r := range s.Ranges {
		p := drill.Promise{Name: r.Name, Kinds: []rules.Kind{rules.KindBreach}, Range: r.Name}
		p.Judges = func(x *drill.Series) bool {
			return members.Applies(n, x.ID, x.Group) && (r.Of != rules.Residual || x.Basis() != "neither")
		}
		if r.Limit != nil {
			p.Kinds = []rules.Kind{rules.KindLimit}
			out = append(out, p)
			continue
		}
		g, err := rules.NewGauge(r)
		if err != nil {
			return nil, err
		}
		if f, ok := g.Forms(r.Breach); ok {
			p.Share = f.Tail
		}
		out = append(out, p)
	}
	doubts := []rules.Kind{rules.KindDoubtful, rules.KindStale, rules.KindRepeat}
	return append(out, drill.Promise{Name: "doubtful, stale, repeat", Kinds: doubts, Share: s.Doubtful}), nil
}

// drillSection is a part of the table: plants counted in one way.
type drillSection struct {
	by   string
	rows []drill.Row
}

// sections count the plants of all rounds by kind, by group and by what the series are held against.
func (d *driller) sections() []drillSection {
	out := []drillSection{{by: "kind"}, {by: "group"}, {by: "held against"}}
	for _, r := range d.rounds {
		all := drill.Outcomes(d.book, r.plan, r.flags)
		for i, rows := range [][]drill.Row{drill.ByKind(all), drill.SplitBy(d.book, errorsOnly(all), groupWord),
			drill.SplitBy(d.book, errorsOnly(all), (*drill.Series).Basis)} {
			for _, row := range rows {
				out[i].add(row)
			}
		}
	}
	return out
}

func groupWord(s *drill.Series) string {
	if s.Group == "" {
		return "no group"
	}
	return s.Group
}

// errorsOnly leaves true moves out.
func errorsOnly(all []drill.Outcome) (out []drill.Outcome) {
	for _, o := range all {
		if !o.Kind.True() {
			out = append(out, o)
		}
	}
	return out
}

func (s *drillSection) add(row drill.Row) {
	i := slices.IndexFunc(s.rows, func(r drill.Row) bool { return r.Name == row.Name })
	if i < 0 {
		s.rows = append(s.rows, drill.Row{})
		i = len(s.rows) - 1
	}
	s.rows[i].Sum(row)
}

// untouched counts flags on untouched days: of the rounds that leave single days untouched, those of rows where there are any.
func (d *driller) untouched(promises []drill.Promise) (lines []drill.Quiet, refused, files int) {
	lines = make([]drill.Quiet, len(promises))
	for _, r := range d.rounds {
		for i, q := range drill.Untouched(d.book, r.plan, r.flags, promises) {
			lines[i].Name = q.Name
			lines[i].Values += q.Values
			lines[i].Flags += q.Flags
			lines[i].Promised += q.Promised
		}
		n, of := drill.RefusedUntouched(d.book, r.plan, r.flags)
		refused, files = refused+n, files+of
	}
	return lines, refused, files
}

func (d *driller) print(promises []drill.Promise) error {
	sections := d.sections()
	lines, refused, files := d.untouched(promises)
	if d.options.format == "table" {
		return d.table(sections, lines, refused, files)
	}
	l, err := newListing(d.app.out, d.options.format, drillColumns)
	if err != nil {
		return err
	}
	for _, s := range sections {
		for _, r := range s.rows {
			cells := []cell{text(s.by), text(r.Name)}
			for _, n := range []int{r.Planted, r.SameDay, r.FiveDays, r.Right, r.Wrong, r.Not, r.Single, r.Flags, r.Followed} {
				cells = append(cells, integer(n))
			}
			if err := l.row(append(cells, null, null)...); err != nil {
				return err
			}
		}
	}
	for _, q := range lines {
		if err := l.row(quietCells(q.Name, q.Flags, q.Values, number(rules.Some(q.Promised)))...); err != nil {
			return err
		}
	}
	if err := l.row(quietCells("refused files", refused, files, null)...); err != nil {
		return err
	}
	return l.end()
}

// quietCells are the columns of a line on untouched days.
func quietCells(name string, flags, values int, promised cell) []cell {
	return []cell{text("untouched"), text(name), null, null, null, null, null, null, null, integer(flags), null, integer(values), promised}
}

func (d *driller) table(sections []drillSection, lines []drill.Quiet, refused, files int) error {
	b, out := d.book, d.app.out
	fmt.Fprintf(out, "%s, %s to %s, %s. Plants drawn with %s.\n\n", rules.Counted(len(b.Series), "series"), b.Dates[d.from], b.Dates[len(b.Dates)-1],
		rules.Counted(len(b.Dates)-d.from, "date"), seedWords(d.options))
	w := columns(out)
	for n, s := range sections {
		if n > 0 {
			fields(w)
		}
		fields(w, s.by, "planted", "same day", "5 days", "named right", "wrong", "not named", "flags")
		for _, r := range fewGroups(s.rows) {
			fields(w, printable(r.Name), fmt.Sprint(r.Planted), shareOf(r.SameDay, r.Planted), shareOf(r.FiveDays, r.Planted), namedShare(r.Right, &r),
				namedShare(r.Wrong, &r), namedShare(r.Not, &r), fmt.Sprint(r.Flags))
		}
	}
	if err := w.Flush(); err != nil {
		return err
	}
	fmt.Fprintf(out, "\nNamed right, wrong and not: of those caught within five days. Group and reference: errors in single series.\n")
	if n := len(sections[1].rows); len(fewGroups(sections[1].rows)) < n {
		fmt.Fprintf(out, "Of %s, the %d of which least was caught; --format csv has all.\n", rules.Counted(n, "group"), mostRows)
	}
	fmt.Fprintln(out)
	w = columns(out)
	fields(w, "untouched days", "values", "flags", "promised")
	for _, q := range lines {
		promised := "-"
		if q.Promised > 0 {
			promised = fmt.Sprintf("%.1f", q.Promised)
		}
		fields(w, printable(q.Name), rules.Thousands(q.Values), fmt.Sprint(q.Flags), promised)
	}
	fields(w, "refused files", rules.Thousands(files), fmt.Sprint(refused), "-")
	if err := w.Flush(); err != nil {
		return err
	}
	_, err := fmt.Fprintf(out, "\n%s\n", drillCaution)
	return err
}

// mostRows is how many groups the table shows.
const mostRows = 20

// fewGroups keeps the rows of which least was caught where there are too many to be read; CSV and JSON have them all.
func fewGroups(rows []drill.Row) []drill.Row {
	if len(rows) <= max(mostRows, len(drill.Kinds)) {
		return rows
	}
	rows = slices.Clone(rows)
	slices.SortStableFunc(rows, func(a, b drill.Row) int {
		x, _ := drill.Share(a.FiveDays, a.Planted)
		y, _ := drill.Share(b.FiveDays, b.Planted)
		return cmp.Compare(x, y)
	})
	return rows[:mostRows]
}

func seedWords(o *drillOptions) string {
	if o.seeds == 1 {
		return fmt.Sprintf("seed %d", o.seed)
	}
	return fmt.Sprintf("seeds %d to %d", o.seed, o.seed+uint64(o.seeds)-1)
}

// shareOf writes a count as a share in per cent.
func shareOf(n, of int) string {
	share, ok := drill.Share(n, of)
	if !ok {
		return "-"
	}
	return fmt.Sprintf("%.0f %%", 100*share)
}

// namedShare is of those caught; nothing where no cause is asked for.
func namedShare(n int, r *drill.Row) string {
	return shareOf(n, r.Right+r.Wrong+r.Not)
}

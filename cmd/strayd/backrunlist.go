package main

import (
	"errors"
	"fmt"
	"os"

	"strayd/rules"
	"strayd/rules/backrun"
)

// backRunColumns are those of a back-run's listing: a figure a row, with the whole that it is a part of where there is one, of these settings
// and the other.
const backRunColumns = "part,group,range,figure,these,these_of,other,other_of"

// backRunRow is a row of the listing on its way.
type backRunRow struct {
	part, group, of, figure string
	values                  [2][2]cell // by side: the figure and its whole
}

func (r *backRunning) list() error {
	l, err := newListing(r.app.out, r.options.format, backRunColumns)
	if err != nil {
		return err
	}
	for _, row := range r.rows() {
		v := row.values
		for n := range v {
			for i := range v[n] {
				if v[n][i] == (cell{}) {
					v[n][i] = null
				}
			}
		}
		if err := l.row(text(row.part), text(row.group), text(row.of), text(row.figure), v[0][0], v[0][1], v[1][0], v[1][1]); err != nil {
			return err
		}
	}
	return l.end()
}

func (r *backRunning) rows() (out []backRunRow) {
	out = r.headRows()
	out = append(out, r.countRows()...)
	out = append(out, r.coverRows()...)
	out = append(out, r.changeRows()...)
	return append(out, r.adviceRows()...)
}

func (r *backRunning) headRows() (out []backRunRow) {
	d := r.compare.Dates
	for _, x := range []struct {
		figure string
		value  cell
	}{{"values", integer(r.past.Values)}, {"values compared", integer(r.compare.Values)}, {"dates", integer(len(d))}, {"from", date(d[0])}, {"to", date(d[len(d)-1])}} {
		row := backRunRow{part: "past", figure: x.figure}
		for n := range r.names {
			row.values[n][0] = x.value
		}
		out = append(out, row)
	}
	row := backRunRow{part: "past", figure: "settings"}
	for n, name := range r.names {
		row.values[n][0] = text(name)
	}
	out = append(out, row)
	for _, words := range r.unlike {
		row := backRunRow{part: "past", figure: "difference"}
		row.values[1][0] = text(words)
		out = append(out, row)
	}
	return out
}

func (r *backRunning) countRows() (out []backRunRow) {
	for _, c := range r.compare.Counts() {
		total := backRunRow{part: "flags", group: c.Group, figure: string(c.Kind)}
		week := backRunRow{part: "flags", group: c.Group, figure: string(c.Kind) + " a week"}
		for n, flags := range c.Flags {
			total.values[n][0] = integer(flags)
			if c.Group == "" && c.Kind != backrun.Busiest && c.Kind != rules.KindMarketDay {
				total.values[n][1] = integer(r.compare.Values)
			}
			week.values[n][0] = number(rules.Some(float64(flags) / r.compare.Weeks()))
		}
		if out = append(out, total); c.Kind != backrun.Busiest {
			out = append(out, week)
		}
	}
	breaches, doubts := backRunRow{part: "flags", figure: "expected beyond breach lines"}, backRunRow{part: "flags", figure: "doubtful, stale, repeat at most"}
	for n, s := range r.compare.Sides {
		beyond, most := r.compare.Expected(s)
		breaches.values[n][0] = number(rules.Some(beyond))
		doubts.values[n] = [2]cell{number(rules.Some(most)), integer(r.compare.Values)}
	}
	return append(out, breaches, doubts)
}

// coverRows are the figures of coverage, those of both sides beside each other.
func (r *backRunning) coverRows() (out []backRunRow) {
	at := map[string]int{}
	r.eachCover(func(side int, c *rules.CoverFigures) {
		put := func(figure string, value, of cell) {
			key := coverWords(c) + "\x00" + figure
			n, ok := at[key]
			if !ok {
				n, at[key] = len(out), len(out)
				out = append(out, backRunRow{part: "coverage", group: c.Group, of: c.Range, figure: figure})
			}
			out[n].values[side] = [2]cell{value, of}
		}
		coverLine(put, "inner", c.Share, c.Inner, &c.InnerSays)
		if c.Level > 0 {
			coverLine(put, "breach", c.Level, c.Outer, &c.OuterSays)
		} else {
			put("breach beyond", integer(c.Outer.Beyond), integer(c.Outer.Judged))
		}
		put("series", integer(c.Series), null)
		for _, z := range []struct {
			word string
			n    int
		}{{"green", c.Zones.Green}, {"yellow", c.Zones.Yellow}, {"red", c.Zones.Red}, {"more than 4", len(c.Notable)}, {"none", c.None}} {
			put("zone "+z.word, integer(z.n), integer(c.Zones.Whole()))
		}
	})
	return out
}

// coverLine puts the figures of one line.
func coverLine(put func(figure string, value, of cell), line string, share float64, t rules.CoverTally, says *rules.Coverage) {
	put(line+" share", number(rules.Some(share)), null)
	put(line+" beyond", integer(t.Beyond), integer(t.Judged))
	put(line+" expected", number(rules.Some(says.Expected)), integer(t.Judged))
	put(line+" kupiec p", number(says.Kupiec), null)
	put(line+" p together", number(says.Moving), null)
	put(line+" christoffersen p", number(says.Apart), null)
	put(line+" conditional p", number(conditional(t, share)), null)
	put(line+" verdict", text(string(says.Verdict)), null)
}

func (r *backRunning) changeRows() (out []backRunRow) {
	two := len(r.names) == 2
	if two {
		changes, kept := r.compare.Changes()
		count := map[backrun.Turn]int{}
		for i := range changes {
			count[changes[i].Turn]++
		}
		out = append(out, backRunRow{part: "changes", figure: "both", values: [2][2]cell{{integer(kept)}, {integer(kept)}}},
			backRunRow{part: "changes", figure: string(backrun.Turns), values: [2][2]cell{{}, {integer(count[backrun.Turns]), integer(kept)}}},
			backRunRow{part: "changes", figure: string(backrun.Vanishes), values: [2][2]cell{{integer(count[backrun.Vanishes])}, {}}},
			backRunRow{part: "changes", figure: string(backrun.Appears), values: [2][2]cell{{}, {integer(count[backrun.Appears])}}})
	}
	all := r.compare.Decisions()
	for _, d := range all {
		row := backRunRow{part: "decisions", figure: string(d.Conclusion)}
		for n, flagged := range d.Flagged {
			row.values[n] = [2]cell{integer(flagged), integer(d.Decided)}
		}
		out = append(out, row)
	}
	if two {
		pro, con := backrun.Balance(all)
		out = append(out, backRunRow{part: "decisions", figure: "for", values: [2][2]cell{{}, {integer(pro)}}},
			backRunRow{part: "decisions", figure: "against", values: [2][2]cell{{}, {integer(con)}}})
	}
	return out
}

func (r *backRunning) adviceRows() (out []backRunRow) {
	a := r.advice
	if a == nil {
		return nil
	}
	put := func(figure string, value cell) {
		out = append(out, backRunRow{part: "advice", figure: figure, values: [2][2]cell{{}, {value}}})
	}
	put("budget a week", number(rules.Some(a.Budget)))
	if a.Why != "" {
		put("why", text(a.Why))
	}
	if a.Level == 0 {
		return out
	}
	put("level", number(rules.Some(a.Level)))
	put("level low", number(rules.Num{V: a.LevelLow, OK: a.LevelLow > 0}))
	put("level high", number(rules.Num{V: a.LevelHigh, OK: a.LevelHigh > 0}))
	put("rate low", number(rules.Some(a.RateLow)))
	put("rate high", number(rules.Some(a.RateHigh)))
	put("level of the first half", number(a.HalfLevel))
	put("rate in the second half", number(a.HalfRate))
	for _, name := range r.kept {
		put("range that keeps its line", text(name))
	}
	return out
}

const changedColumns = "change,series,group,date,kind,kind_before,range,return,low,high,z,tail,ref,standing,decision"

// listChanges writes what the sides do not flag alike into a file, as CSV.
func (r *backRunning) listChanges(path string) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	l, err := newListing(f, "csv", changedColumns)
	if err == nil {
		changes, _ := r.compare.Changes()
		for i := range changes {
			err = errors.Join(err, l.row(changedCells(&changes[i])...))
		}
		err = errors.Join(err, l.end())
	}
	if err = errors.Join(err, f.Close()); err != nil {
		return fmt.Errorf("--changed %s: %w", path, err)
	}
	return nil
}

func changedCells(c *backrun.Change) []cell {
	f := &c.Flag
	ref, standing, decision := null, null, null
	if c.Issued != nil {
		ref, standing = integer(c.Issued.Ref), text(string(c.Issued.Standing))
		if c.Issued.Decided != nil {
			decision = text(string(c.Issued.Decided.Conclusion))
		}
	}
	return []cell{text(string(c.Turn)), text(f.Series), text(f.Group), date(f.Date), text(string(f.Kind)), text(string(c.Before)), text(f.Range),
		units(f.Return), number(f.Low), number(f.High), number(f.Z), number(f.Tail), ref, standing, decision}
}

package main

import (
	"fmt"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// turn is one change of a flag's standing.
type turn struct {
	at       time.Time
	standing rules.Standing
	act      *rules.Act // nil where the program changed it
	note     string     // of the flag
}

// turns are the changes of a flag's standing, oldest first; the first is how it was raised.
func turns(r *watcher.Reader, ref uint64) (out []turn, err error) {
	past, err := r.View.FlagPast(ref)
	if err != nil {
		return nil, err
	}
	for i, v := range past {
		t := turn{at: v.RaisedAt, standing: v.Standing, note: v.Note}
		switch {
		case v.Last != nil && v.Last.Step == v.Step:
			t.at, t.act = v.Last.At, v.Last
		case i > 0 && v.Standing == past[i-1].Standing:
			continue
		case i > 0:
			if t.at, err = r.Received(v.Step); err != nil {
				return nil, err
			}
		}
		out = append(out, t)
	}
	return out, nil
}

// words say when and by whom the standing changed, and how.
func (t *turn) words() string {
	at := t.at.Format(time.RFC3339)
	if t.act == nil {
		return at
	}
	s := at + " by " + t.act.By.String()
	if t.act.By.Root() {
		s += ", as root"
	}
	return s + actWords(t.act)
}

// cells are the members of a turn in JSON.
func (t *turn) cells() ([]string, []cell) {
	names := []string{"at", "standing", "by", "uid", "act", "conclusion", "value", "reason", "note", "override", "until"}
	if t.act == nil {
		return names, []cell{moment(t.at), text(string(t.standing)), null, null, null, null, null, null, null, null, null}
	}
	a := t.act
	return names, []cell{moment(t.at), text(string(t.standing)), text(a.By.Name), integer(a.By.UID), text(string(a.Deed)), text(string(a.Conclusion)),
		units(a.Value), text(string(a.Reason)), text(a.Note), text(a.Override), date(a.Until)}
}

// explainTurns lists how a flag's standing came about.
func explainTurns(line func(name, format string, args ...any), r *watcher.Reader, f *rules.Flag) error {
	if f == nil {
		return nil
	}
	list, err := turns(r, f.Ref)
	if err != nil || len(list) < 2 {
		return err
	}
	for _, t := range list {
		line(string(t.standing), "%s", t.words())
	}
	return nil
}

// turnsJSON is the same as a JSON array.
func turnsJSON(r *watcher.Reader, f *rules.Flag) (string, error) {
	if f == nil {
		return "[]", nil
	}
	list, err := turns(r, f.Ref)
	if err != nil {
		return "", err
	}
	var objects []string
	for _, t := range list {
		names, cells := t.cells()
		objects = append(objects, object(names, cells, "    ", " "))
	}
	return array(objects), nil
}

// explainFileTurns does the same for a flag that is about no observation.
func (a *app) explainFileTurns(r *watcher.Reader, f *rules.Flag) error {
	w := columns(a.out)
	line := func(name, format string, args ...any) { fields(w, "  "+name, fmt.Sprintf(format, args...)) }
	return firstError(explainTurns(line, r, f), w.Flush())
}

// takesWords say what the window takes of a value that it does not simply take as it is; decided is what somebody decided of the value.
func takesWords(row *watcher.Row, restated bool, decided *rules.Act) string {
	used := "nothing of it"
	if row.Used != rules.Missing {
		used = rules.InPercent(row.Used.Float())
		if row.Residual.OK {
			used = "a residual of " + used
		}
	}
	switch {
	case decided != nil && row.Used == row.Judged():
		return "all of it, as " + decided.By.String() + " decided"
	case decided != nil:
		return used + ", as " + decided.By.String() + " decided"
	case row.Used == rules.Missing:
		return used + " until someone decides"
	case row.Used == row.Judged():
		return ""
	case restated:
		return used + ", now that it is restated"
	}
	return used + " until someone decides"
}

package watcher_test

import (
	"math"
	"slices"

	"strayd/rules"
	"strayd/watcher"
)

// groups recomputes what the groups lent: the median, over the group's series, of the plain deviation of their returns as received in
// the range's window before the date, where at least three series have one of five values or more; and finds it in the provisional z.
func (d *definition) groups(s *shelf, settings *rules.Settings) {
	d.t.Helper()
	members, err := rules.NewMembership(settings)
	if err != nil {
		d.t.Fatal(err)
	}
	raw := map[string][]entry{}
	for _, name := range sortedFiles(s) {
		for _, e := range s.files[name] {
			raw[e.series] = append(raw[e.series], e)
		}
	}
	windows := map[string]*rules.Range{}
	for n := range settings.Ranges {
		windows[settings.Ranges[n].Name] = &settings.Ranges[n]
	}
	lent := 0
	d.each(func(rows []watcher.Row) {
		for _, row := range rows {
			if !row.Provisional || row.Z.V == 0 || row.Group == "" {
				continue
			}
			group, ok := groupDeviation(raw, members, row.Group, windows[row.Range].Window, row.Date)
			if !ok || group <= row.Deviation.V {
				continue
			}
			lent++
			spread := (row.Return.Float() - row.Mean.V) / row.Z.V
			want := max(group, rules.ScaleFloor) * math.Sqrt(1+1/float64(row.N))
			// a coarse tick may be more than what is lent; the values here have eight decimals, whose tick is 3e-9
			if math.Abs(spread/want-1) > 1e-9 {
				d.t.Fatalf("%+v: z divides by %v, the group lends %v", row, spread, want)
			}
		}
	})
	if lent == 0 {
		d.t.Error("no group lent a deviation")
	}
}

func sortedFiles(s *shelf) (out []string) {
	for name := range s.files {
		out = append(out, name)
	}
	slices.Sort(out)
	return out
}

func groupDeviation(raw map[string][]entry, members *rules.Membership, group string, window int, date rules.Date) (float64, bool) {
	var deviations []float64
	for series, entries := range raw {
		if members.Group(series) != group {
			continue
		}
		var values []float64
		later := date
		for _, e := range slices.Backward(entries) {
			if e.date >= date {
				continue
			}
			if len(values) == window || rules.Weekdays(e.date, later) > rules.DormantAfter {
				break
			}
			if rules.InWindow(e.value) {
				values, later = append(values, e.value.Float()), e.date
			}
		}
		if d := deviationOf(values); len(values) >= rules.LeastJudged && d > 0 {
			deviations = append(deviations, d)
		}
	}
	if len(deviations) < 3 {
		return 0, false
	}
	slices.Sort(deviations)
	n := len(deviations)
	return (deviations[(n-1)/2] + deviations[n/2]) / 2, true
}

// deviationOf is the deviation with divisor n-1, in two passes.
func deviationOf(values []float64) float64 {
	mean, sum := 0.0, 0.0
	for _, v := range values {
		mean += v / float64(len(values))
	}
	for _, v := range values {
		sum += (v - mean) * (v - mean)
	}
	return math.Sqrt(sum / float64(len(values)-1))
}

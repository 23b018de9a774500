package main

import (
	"fmt"
	"math"
	"math/big"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"strayd/rules"
)

// seeds is how many invented books each property is tried on: STRAYD_SEEDS, or few.
func seeds() uint64 {
	if n, err := strconv.ParseUint(os.Getenv("STRAYD_SEEDS"), 10, 64); err == nil {
		return n
	}
	return 3
}

// forBooks tries a property on invented books; a failure prints its seed in the test's name.
func forBooks(t *testing.T, property func(t *testing.T, b *invented, ranges []oracleRange)) {
	for seed := range seeds() {
		t.Run(fmt.Sprintf("seed %d", seed), func(t *testing.T) {
			t.Parallel()
			b := invent(seed)
			property(t, b, inventRanges(b.random))
		})
	}
}

// deliver puts files into the inbox, with a pass after every few of them.
func (f *folder) deliver(b *invented, files [][]bookRow) {
	f.t.Helper()
	for n, rows := range files {
		f.write(fmt.Sprintf("inbox/f%04d.csv", n), fileText(rows))
		if n == len(files)-1 || b.random.IntN(15) == 0 {
			f.must("pass", "--settled")
		}
	}
}

func (o *oracle) names() (out []string) {
	for s := range o.series {
		out = append(out, s)
	}
	slices.Sort(out)
	return out
}

// History equals the oracle where every observation came in order.
func TestHistoryEqualsTheOracle(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		files := b.daily()
		f.deliver(b, files)
		for _, rows := range files {
			o.take(rows)
		}
		o.compare(t, f)
	})
}

// History equals an oracle that carries the verdicts as issued, after late days, late values and restatements; and so does what would
// be in range next.
func TestLateAndRestatedEqualTheOracle(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		files := b.rough()
		f.deliver(b, files)
		for _, rows := range files {
			o.take(rows)
		}
		o.compare(t, f)
		o.compareExpected(t, f, b.dates[len(b.dates)-1]+1)
		f.must("ledger", "verify")
	})
}

// compare holds the history of every series against the oracle.
func (o *oracle) compare(t *testing.T, f *folder) {
	t.Helper()
	compared := 0
	for _, series := range o.names() {
		rows := f.list("history", series)
		if want := len(o.series[series]) * len(o.ranges); len(rows) != want {
			t.Fatalf("%s: %d rows, want %d", series, len(rows), want)
		}
		for i, h := range o.series[series] {
			for k := range o.ranges {
				c := &oracleCheck{t: t, got: rows[i*len(o.ranges)+k]}
				c.observation(series, &o.ranges[k], h, k)
				compared++
			}
			if t.Failed() {
				return // one observation shows the fault
			}
		}
	}
	if compared == 0 {
		t.Error("nothing was compared")
	}
}

// oracleCheck holds one row against the oracle.
type oracleCheck struct {
	t   *testing.T
	got record
}

func (c *oracleCheck) text(column, want string) {
	c.t.Helper()
	if c.got[column] != want {
		c.t.Errorf("%s is %q, want %q in %v", column, c.got[column], want, c.got)
	}
}

func (c *oracleCheck) figure(column string, want, rel, abs float64) {
	c.t.Helper()
	if math.IsNaN(want) {
		c.text(column, "")
		return
	}
	if got := c.got.number(c.t, column); !(math.Abs(got-want) <= rel*math.Abs(want)+abs) {
		c.t.Errorf("%s is %v, want %v, off by %.3g in %v", column, got, want, got-want, c.got)
	}
}

// exact compares a return with units, as rationals.
func (c *oracleCheck) exact(column string, want rules.Units, off int64) {
	c.t.Helper()
	if want == rules.Missing {
		c.text(column, "")
		return
	}
	got, ok := new(big.Rat).SetString(c.got[column])
	diff := new(big.Rat)
	if ok {
		diff.Sub(got.Mul(got, big.NewRat(1e15, 1)), big.NewRat(int64(want), 1))
	}
	if !ok || diff.Abs(diff).Cmp(big.NewRat(off, 1)) > 0 {
		c.t.Errorf("%s is %q, want %d units within %d in %v", column, c.got[column], want, off, c.got)
	}
}

func (c *oracleCheck) observation(series string, r *oracleRange, h *oracleObservation, k int) {
	c.t.Helper()
	v := &h.issued[k]
	c.text("series", series)
	c.text("date", h.date.String())
	c.exact("return", h.value, 0)
	c.text("range", r.name)
	c.text("verdict", v.finding)
	c.why(r, v, h)
	if r.limit {
		c.text("n", "")
	} else {
		c.text("n", fmt.Sprint(v.n))
		c.text("window_from", v.from.String())
		c.text("window_to", v.to.String())
	}
	c.verdict(v)
	c.exact("used", h.used[k], nearUnits)
}

// The program's lines are floats, so that a clipped value may differ from the oracle's by the unit to which it is rounded; such units
// go on into the lines of later days. Everything else is exact up to some last places of a float.
const (
	nearUnits = 64
	nearValue = nearUnits * 1e-15
)

func (c *oracleCheck) verdict(v *oracleVerdict) {
	c.t.Helper()
	c.figure("mean", v.mean, 1e-14, nearValue)
	c.figure("deviation", v.deviation, 1e-13, nearValue)
	c.figure("low", v.low, 1e-12, 10*nearValue)
	c.figure("high", v.high, 1e-12, 10*nearValue)
	c.figure("z", v.z, 1e-9, 1e-8)
	c.figure("tail", v.tail, 1e-6, 0)
	c.figure("log10_tail", v.log10, 1e-7, 1e-9)
}

func (c *oracleCheck) why(r *oracleRange, v *oracleVerdict, h *oracleObservation) {
	c.t.Helper()
	why := c.got["why"]
	for part, want := range map[string]bool{"provisional": v.provisional, "arrived late": h.late, "restated": h.changed > 0} {
		if strings.Contains(why, part) != want {
			c.t.Errorf("why %q: has %q is %v, want %v in %v", why, part, !want, want, c.got)
		}
	}
	quiet := !v.provisional && !h.late && h.changed == 0 && v.finding != "not judged"
	if (why == "") != quiet {
		c.t.Errorf("why is %q in %v", why, c.got)
	}
	need := fmt.Sprintf("have %d observations", v.n)
	if v.finding == "not judged" && v.n > 0 && !strings.Contains(why, need) && !strings.Contains(why, fmt.Sprintf("over %d observations", v.n)) {
		c.t.Errorf("why is %q, want the reason and %d observations in %v", why, v.n, c.got)
	}
}

// compareExpected holds what `ranges` prints against the oracle's lines for a date.
func (o *oracle) compareExpected(t *testing.T, f *folder, on rules.Date) {
	t.Helper()
	rows := f.list("ranges", "--now", on.String())
	if want := len(o.series) * len(o.ranges); len(rows) != want {
		t.Fatalf("ranges gives %d rows, want %d", len(rows), want)
	}
	index := map[string]int{}
	for k := range o.ranges {
		index[o.ranges[k].name] = k
	}
	for _, row := range rows {
		k := index[row["range"]]
		v := o.judge(o.series[row["series"]], k, on, 0)
		c := &oracleCheck{t: t, got: row}
		if !o.ranges[k].limit {
			c.text("n", fmt.Sprint(v.n))
			if v.n == 0 {
				c.text("n", "0")
			}
		}
		c.figure("mean", v.mean, 1e-14, nearValue)
		c.figure("deviation", v.deviation, 1e-13, nearValue)
		c.figure("low", v.low, 1e-12, 10*nearValue)
		c.figure("high", v.high, 1e-12, 10*nearValue)
		c.figure("watch_low", v.watchLow, 1e-12, 10*nearValue)
		c.figure("watch_high", v.watchHigh, 1e-12, 10*nearValue)
	}
}

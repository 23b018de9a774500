package config

import (
	"fmt"
	"math"

	"strayd/rules"
	"strayd/stats"
)

// expected checks one range.
func (d *decoder) expected(p string, r *rules.Range) {
	if d.has(join(p, hard)) {
		if d.sound(join(p, hard)) && r.Limit.Low >= r.Limit.High {
			d.failAt(p+".limit", trouble{message: "the lower line is not below the upper",
				got: "[" + r.Limit.Low.String() + ", " + r.Limit.High.String() + "]"})
		}
		return
	}
	if d.sound(p+".decay", p+".scale") && r.Scale != rules.Weighted && r.Decay != standardDecay {
		d.failAt(p+".decay", trouble{message: "decay has no effect here", got: "scale " + string(r.Scale), want: "scale weighted"})
	}
	if d.sound(p+".tail", p+".scale", p+".predictive") && r.Tail.Name == "predictive-t" {
		d.predictive(p, r)
	}
	d.nearer(p, r)
	d.floor(p+".watch", r, r.Watch)
	d.floor(p+".breach", r, r.Breach)
	d.usable(p, *r)
}

// standardDecay is the default of decay; it may stand beside any scale, as it says nothing.
const standardDecay = 0.94

// predictive holds that predictive-t comes with what it implies.
func (d *decoder) predictive(p string, r *rules.Range) {
	if r.Scale != rules.Plain {
		d.failAt(p+".tail", trouble{message: "predictive-t goes with a plain scale only", got: "scale " + string(r.Scale), want: "scale plain"})
	}
	if !r.Predictive {
		d.failAt(p+".predictive", trouble{message: "predictive-t implies the predictive factor", got: "false", want: "true"})
	}
}

// floor holds that a rank line is not below the least tail that ranks can show: 2/(n+1), one-sided 1/(n+1).
func (d *decoder) floor(p string, r *rules.Range, l rules.Line) {
	if r.Tail.Name != "rank" || !d.sound(p, parent(p)+".window", parent(p)+".side", parent(p)+".tail") {
		return
	}
	if l.Z != 0 {
		d.failAt(p, trouble{message: "a rank has no deviations", got: "a line in z", want: "tail, confidence or budget"})
		return
	}
	least := 2 / float64(r.Window+1)
	if r.Side != rules.Both {
		least = 1 / float64(r.Window+1)
	}
	if tail := l.Probability(); tail > 0 && tail < least {
		d.failAt(p, trouble{message: fmt.Sprintf("below the floor of a rank over %d observations", r.Window),
			got: "tail " + percent(tail) + d.unsaid(p), want: "tail " + percent(roundUp(least)) + " or more", hint: "take a longer window or another tail"})
	}
}

// roundUp is v to four digits, not below it.
func roundUp(v float64) float64 {
	scale := math.Pow10(3 - int(math.Floor(math.Log10(v))))
	return math.Ceil(v*scale) / scale
}

// unsaid marks a value that the file does not give.
func (d *decoder) unsaid(p string) string {
	if d.has(p) {
		return ""
	}
	return ", the default"
}

// nearer holds that the watch line lies nearer the centre than the breach line. A watch line that is left out and would not
// moves onto the breach line: nothing is between the two.
func (d *decoder) nearer(p string, r *rules.Range) {
	if !d.sound(p+".watch", p+".breach", p+".side", p+".tail") {
		return
	}
	inner, comparable := d.compare(r)
	switch {
	case !comparable || inner:
	case !d.has(p + ".watch"):
		r.Watch = r.Breach
	default:
		d.failAt(p+".watch", trouble{message: "watch is not nearer the centre than breach",
			got: "watch " + lineText(r.Watch) + ", breach " + lineText(r.Breach) + d.unsaid(p+".breach")})
	}
}

// compare says whether watch is the inner line, where the two can be compared: a budget has no tail before series are known.
func (d *decoder) compare(r *rules.Range) (inner, comparable bool) {
	switch {
	case r.Watch.Z != 0 && r.Breach.Z != 0:
		return r.Watch.Z < r.Breach.Z, true
	case r.Watch.Budget != 0 && r.Breach.Budget != 0:
		return r.Watch.Budget > r.Breach.Budget, true
	}
	watch, ok := lineTail(r, r.Watch)
	breach, also := lineTail(r, r.Breach)
	return watch > breach, ok && also
}

// lineTail is the tail probability at which a line of the range lies, given a full window.
func lineTail(r *rules.Range, l rules.Line) (float64, bool) {
	if l.Z == 0 {
		return l.Probability(), l.Probability() > 0
	}
	t, ok := model(r)
	if !ok {
		return 0, false
	}
	side := stats.TwoSided
	if r.Side != rules.Both {
		side = stats.OneSided
	}
	line, err := t.LineOfZ(l.Z, side)
	return line.Tail, err == nil
}

// model is the tail that turns the z of a line into a probability; a rank has none.
func model(r *rules.Range) (t stats.Tail, ok bool) {
	var err error
	switch r.Tail.Name {
	case "normal":
		return stats.Normal(), true
	case "t":
		t, err = stats.ScaledT(r.Tail.DF)
	case "auto": // begins as t5
		t, err = stats.ScaledT(5)
	case "predictive-t":
		t, err = stats.RawT(float64(r.Window - 1))
	default:
		return t, false
	}
	return t, err == nil
}

// usable holds that the rules take the range; what is wrong with it is mostly said before, in words nearer to the file.
func (d *decoder) usable(p string, r rules.Range) {
	for _, l := range []*rules.Line{&r.Watch, &r.Breach} {
		if l.Budget > 0 {
			l.Level = leastLevel
		}
	}
	if _, err := rules.NewGauge(r); err != nil && d.sound(p) {
		d.failAt(p, trouble{message: err.Error()})
	}
}

// leastLevel is the least tail probability that a budget becomes.
const leastLevel = 0.0005

func lineText(l rules.Line) string {
	switch {
	case l.Tail != 0:
		return "tail " + percent(l.Tail)
	case l.Confidence != 0:
		return "confidence " + percent(l.Confidence)
	case l.Z != 0:
		return "z " + plain(l.Z)
	}
	return plain(l.Budget) + " a week"
}

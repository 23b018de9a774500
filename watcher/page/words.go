package page

import (
	"fmt"
	"html/template"
	"strconv"
	"strings"
	"time"
	"unicode"

	"strayd/rules"
)

// words are the functions that the templates call.
func words() template.FuncMap {
	return template.FuncMap{
		"safe": Safe, "date": dateWords, "units": unitWords, "num": numWords, "between": betweenWords, "once": onceWords, "z": zWords,
		"count": rules.Counted, "thousands": rules.Thousands, "at": clockWords,
		"looks": looksWords, "deed": newForm,
		"iso": func(d rules.Date) string { return d.String() },
	}
}

// Safe takes out of a text from other people's files what could turn or hide what stands around it.
func Safe(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || unicode.Is(unicode.Cf, r) || r == '\u2028' || r == '\u2029' {
			return '\ufffd'
		}
		return r
	}, s)
}

func dateWords(d rules.Date) string {
	if d == rules.NoDate {
		return "–"
	}
	return d.Day()
}

func unitWords(u rules.Units) string {
	if u == rules.Missing {
		return "–"
	}
	return rules.InPercent(u.Float())
}

func numWords(n rules.Num) string {
	if !n.OK {
		return "–"
	}
	return rules.InPercent(n.V)
}

func betweenWords(low, high rules.Num) string {
	if s := rules.Between(low, high); s != "" {
		return s
	}
	return "–"
}

func onceWords(tail rules.Num) string {
	if !tail.OK || tail.V <= 0 {
		return "–"
	}
	return rules.OnceIn(tail.V)
}

func zWords(z rules.Num) string {
	if !z.OK {
		return "–"
	}
	return fmt.Sprintf("%+.1f", z.V)
}

func clockWords(t time.Time, zone *time.Location) string {
	if t.IsZero() {
		return "–"
	}
	return t.In(zone).Format("Mon 2006-01-02 15:04")
}

func refWords(refs []uint64) string { return strings.Join(texts(refs), ",") }

// looksWords say what a flag looks like.
func looksWords(f rules.Flag) string {
	if f.LooksLike == "" {
		return ""
	}
	s := f.LooksLike.Words()
	if f.Implied.OK {
		s += "; it would be " + rules.InPercent(f.Implied.V)
	}
	return s
}

// marks is the small drawing of a return beside its range: the range is the middle half of the strip, and what lies far out stands at its end.
type marks struct {
	X      string
	Beyond string // left or right of the strip, "" within
}

const (
	stripWidth = 80.0
	stripLow   = 24.0 // where the low line stands
	stripHigh  = 56.0
)

// newMarks places a return; nil where it has no range with two lines.
func newMarks(f rules.Flag) *marks {
	if f.Return == rules.Missing || !f.Low.OK || !f.High.OK || f.High.V <= f.Low.V {
		return nil
	}
	x := stripLow + (f.Return.Float()-f.Low.V)/(f.High.V-f.Low.V)*(stripHigh-stripLow)
	m := &marks{}
	switch {
	case x < 4:
		x, m.Beyond = 4, "left"
	case x > stripWidth-4:
		x, m.Beyond = stripWidth-4, "right"
	}
	m.X = strconv.FormatFloat(x, 'f', 1, 64)
	return m
}

// deedForm is what the form of a deed is made of.
type deedForm struct {
	Form string
	At   uint64 // the flag on whose page it stands, 0 on that of several
	Deed *deedPart
}

func newForm(form string, at any, d *deedPart) deedForm {
	ref, _ := at.(uint64)
	return deedForm{form, ref, d}
}

package weekly

import (
	"fmt"
	"time"

	"strayd/rules"
)

// newPage lays the log out.
func newPage(l *rules.WeekLog) *page {
	span := l.Now.Span
	p := &page{Week: span.Name(), Dates: span.Monday.Day() + " to " + span.Sunday().Day(), Word: string(l.Word), Sentence: l.Sentence(),
		Cautions: cautions()}
	p.Head = heading(l)
	b := builder{l.Now, l.Last, l.Zone}
	p.Sections = []*section{b.checked(), b.flags(), b.coverage(), b.ageing(), b.closed(), b.feeds(), b.largest(), b.repeats(), b.thin(), b.slow(),
		b.changes(), b.waivers(), b.found(), b.runs(), signOff(l)}
	for _, s := range p.Sections {
		for _, f := range s.Figures {
			if f.first {
				p.First = append(p.First, f)
			}
		}
	}
	p.Drawings = drawings(l)
	return p
}

func heading(l *rules.WeekLog) []string {
	n := l.Now
	lines := []string{
		fmt.Sprintf("%s of %s expected series-days checked; %s late, %s refused", rules.Thousands(n.Checked.Part), rules.Thousands(n.Checked.Whole),
			rules.Counted(kind(n, rules.KindLate), "feed date"), rules.Counted(refused(n), "file")),
		fmt.Sprintf("As known at %s; made at %s by %s; settings number %d; strayd %s", l.Now.Span.AsOf.In(l.Zone).Format("Mon 2006-01-02 15:04 MST"),
			l.Made.In(l.Zone).Format("Mon 2006-01-02 15:04 MST"), foreign(l.By).Text, n.Settings, l.Program),
	}
	if n.Head != "" {
		lines = append(lines, "Head of the record: "+n.Head)
	}
	return lines
}

func kind(w *rules.WeekFigures, k rules.Kind) int {
	for _, r := range w.Raised {
		if r.Kind == k {
			return r.Count
		}
	}
	return 0
}

func refused(w *rules.WeekFigures) (n int) {
	for _, f := range w.Feeds {
		n += f.Refused
	}
	return n
}

func files(w *rules.WeekFigures) (n int) {
	for _, f := range w.Feeds {
		n += f.Files
	}
	return n
}

// builder lays out sections from the figures of the week and of the one before.
type builder struct {
	now, last *rules.WeekFigures
	zone      *time.Location
}

func (b *builder) checked() *section {
	s := &section{Key: "checked", Title: "What was checked"}
	s.first("Series-days checked, of those expected", portions(b.now.Checked, b.last.Checked))
	s.say("Dates on which a feed was late or not whole", counts(kind(b.now, rules.KindLate), due(b.now), kind(b.last, rules.KindLate), due(b.last)))
	s.say("Files refused, of those taken up", counts(refused(b.now), refused(b.now)+files(b.now), refused(b.last), refused(b.last)+files(b.last)))
	t := table{Key: "day", Title: "By valuation date", Head: []string{"date", "checked of expected"}, Empty: "No business day of the week is over."}
	for n, d := range b.now.Days {
		c := cell{Now: count(d.Part), Of: count(d.Whole)}
		if n < len(b.last.Days) && b.last.Days[n].Date == d.Date-7 {
			c.Last, c.LastOf = count(b.last.Days[n].Part), count(b.last.Days[n].Whole)
		}
		t.Rows = append(t.Rows, row{date(d.Date), []cell{c}})
	}
	s.Tables = []table{t}
	return s
}

func due(w *rules.WeekFigures) (n int) {
	for _, f := range w.Feeds {
		n += f.OnTime.Whole
	}
	return n
}

func (b *builder) flags() *section {
	s := &section{Key: "flags", Title: "Flags, expected against observed"}
	s.first("Flags raised for the week's dates", both(count(b.now.Flags), count(b.last.Flags)))
	s.first("Separate events among them, a market day as one", counts(b.now.Events, b.now.Flags, b.last.Events, b.last.Flags))
	s.say("Market days", both(count(b.now.Markets), count(b.last.Markets)))
	last := map[string]rules.RangeFigures{}
	for _, r := range b.last.Ranges {
		last[r.Range] = r
	}
	t := table{Key: "range", Title: "Beyond the breach line, by range", Empty: "No range is estimated.",
		Head: []string{"range", "level", "beyond, of judged", "a market day as one", "expected", "usual, apart", "usual, together", "scatter"}}
	for _, r := range b.now.Ranges {
		o := last[r.Range]
		t.Rows = append(t.Rows, row{foreign(r.Range), []cell{only(level(r.Level)), counts(r.Observed, r.Judged, o.Observed, o.Judged),
			counts(r.Separate, r.Judged, o.Separate, o.Judged), both(real(r.Expected, 1), real(o.Expected, 1)), both(band(r.Low, r.High), band(o.Low, o.High)),
			both(band(r.Narrow, r.Wide), band(o.Narrow, o.Wide)), both(real(r.Together, 1), real(o.Together, 1))}})
	}
	kinds := table{Key: "kind", Title: "Flags by kind", Head: []string{"kind", "flags of all"}, Empty: "No flag was raised."}
	for n, k := range b.now.Raised {
		if o := b.last.Raised[n]; k.Count+o.Count > 0 {
			kinds.Rows = append(kinds.Rows, row{text(string(k.Kind)), []cell{counts(k.Count, b.now.Flags, o.Count, b.last.Flags)}})
		}
	}
	s.Tables = []table{t, kinds}
	s.Notes = []string{"Beyond counts every judged return under the settings in force, history included; flags are what was raised.",
		"Usual is the middle 95 % of what the level promises: apart for series that move independently, which they do not; together " +
			"allows for the scatter of the counts of a day over the dates before, as a multiple of what independent series would have."}
	return s
}

func level(share float64) value {
	if share == 0 {
		return value{"none", ""}
	}
	return value{rules.InPercentPlain(share), real(share, 6).Raw}
}

func band(low, high int) value {
	return value{fmt.Sprintf("%s to %s", rules.Thousands(low), rules.Thousands(high)), fmt.Sprintf("%d..%d", low, high)}
}

func cautions() []string {
	return []string{
		"A flag is a statistical statement about past data: neither advice nor a finding of error; no flag is no certificate.",
		"Ranges look backwards and lag a change of regime. Suggested values are hypotheses; the program alters no source and sends no correction.",
		"Series move together, so flags cluster; many series over many days give some flags by chance.",
		"Materiality, notification and compensation follow local rules, fund documents and professional advice. This must not be the only control on a NAV.",
	}
}

// signOff is the block that a person fills in.
func signOff(l *rules.WeekLog) *section {
	s := &section{Key: "sign-off", Title: "Sign-off"}
	s.say("Prepared by", only(foreign(l.By)))
	s.say("Prepared at", only(moment(l.Made, l.Zone)))
	for _, label := range []string{"Reviewed by (name, date)", "Ranges approved by (name, date)", "Remarks"} {
		s.say(label, only(value{blank, ""}))
	}
	return s
}

const blank = "______________________________"

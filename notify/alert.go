package notify

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"strayd/rules"
)

// alert is the full text of one event, at most eight lines. read is when it can be read at the earliest.
func (t *Teller) alert(news rules.News, e event, read time.Time) []string {
	lines := []string{head(e)}
	for _, f := range e {
		lines = append(lines, rangeLine(f))
	}
	notes := noteLines(e)
	notes[len(notes)-1] = both(notes[len(notes)-1], pendingLine(e))
	if len(e) > 1 { // two kinds have two lines of what was expected
		lines = append(lines, both(looksLine(e[0]), referenceLine(e[0])))
	} else {
		lines = append(lines, referenceLine(e[0]), looksLine(e[0]))
	}
	lines = append(lines, notes...)
	return append(lines, t.fileLine(news, e), t.ownerLine(e[0], read), answerLine(e))
}

// head is the first line, complete alone: what, which series, the value, the valuation date and the ref. The word before the value
// keeps a name written from right to left from drawing the digits to its side.
func head(e event) string {
	f := e[0]
	s := kindWords(e) + " " + subject(f)
	if f.Return != rules.Missing && f.Series != "" {
		s += " returned " + rules.InPercent(f.Return.Float())
	}
	if f.Date != rules.NoDate {
		s += " for " + f.Date.Day()
	}
	return s + ", " + refWords(e)
}

// shortHead is all that a channel of short form is told: ref and series.
func shortHead(e event) string { return "To look at: " + subject(e[0]) + ", " + refWords(e) }

// kindWords are the kinds of an event in capitals, the gravest first.
func kindWords(e event) string {
	var words []string
	for _, f := range e {
		words = append(words, strings.ToUpper(strings.ReplaceAll(string(f.Kind), "-", " ")))
	}
	return strings.Join(words, ", ")
}

// subject is what a flag is about: its series, else its group, else its file and feed.
func subject(f *rules.FlagNews) string {
	switch {
	case f.Series != "":
		return name(f.Series)
	case f.Group != "":
		return "group " + name(f.Group)
	case f.File != "" && f.Kind == rules.KindMissing:
		return "series in " + name(f.File) + " of feed " + name(f.Feed)
	case f.File != "":
		return name(f.File) + " of feed " + name(f.Feed)
	}
	return "feed " + name(f.Feed)
}

func refWords(e event) string {
	refs := strings.Fields(words(e))
	if len(refs) == 1 {
		return "ref " + refs[0]
	}
	return "refs " + listed(refs)
}

// rangeLine says what was expected instead, and how far out the value lies; nothing for a flag without lines.
func rangeLine(f *rules.FlagNews) string {
	lines := rules.Between(f.Low, f.High)
	if lines == "" {
		return ""
	}
	if f.Kind == rules.KindLimit {
		return "The limit " + name(f.Range) + " allows " + lines
	}
	s := fmt.Sprintf("Expected %s (range %s", lines, name(f.Range))
	if f.Window > 0 {
		s += fmt.Sprintf(", %s to %s", rules.Counted(f.Window, "observation"), f.WindowTo.Day())
	}
	s += ")"
	if f.Z.OK {
		s += fmt.Sprintf("; z %+.1f", f.Z.V)
	}
	if f.Tail.OK && f.Tail.V > 0 {
		s += ", " + rules.OnceIn(f.Tail.V)
	}
	return s
}

// noteLines join what the flags say beside their figures: in one line, or in up to three where a file or feed has names to tell.
func noteLines(e event) []string {
	var notes []string
	for _, f := range e {
		if f.Note != "" {
			notes = append(notes, strings.TrimSpace(safe(f.Note)))
		}
	}
	s := strings.Join(notes, "; ")
	if e[0].Kind == rules.KindRefused {
		s = "nothing of it was taken: " + s
	}
	if !wholeFeed(e[0].Kind) {
		return []string{upperFirst(s)}
	}
	return wrap(upperFirst(s), 3)
}

// pendingLine says what the window makes of the value until somebody decides.
func pendingLine(e event) string {
	var s string
	if f := e[0]; f.Kind != rules.KindLimit && slices.Contains(rules.OutOfLine, f.Kind) {
		switch f.Used {
		case rules.Missing:
			s = "Until somebody decides, the window leaves it out."
		case f.Return:
			s = "Until somebody decides, the window takes it in full."
		default:
			s = "Until somebody decides, the window takes it as " + rules.InPercent(f.Used.Float()) + "."
		}
	}
	for _, f := range e {
		if f.Standing == rules.Reopened {
			return strings.TrimSpace(s + " It had been settled and is open again.")
		}
	}
	return s
}

// fileLine says where the value came from and how the rest of its file looks.
func (t *Teller) fileLine(news rules.News, e event) string {
	f := e[0]
	if f.File == "" || f.Kind == rules.KindRefused {
		return t.arrivalLine(f, news.At)
	}
	s := "File " + name(f.File)
	if f.Line > 0 {
		s += fmt.Sprintf(" line %d", f.Line)
	}
	s += fmt.Sprintf(" of feed %s, taken %s", name(f.Feed), clock(news.At, news.At, t.Zone))
	if f.File != news.File || news.Rows == 0 {
		return s
	}
	return s + fmt.Sprintf("; %s, %s on its newest date, %s", rules.Counted(news.Rows, "row"), rules.Counted(news.Series, "series"),
		others(len(news.Flags)-len(e)))
}

func others(n int) string {
	if n <= 0 {
		return "no other flag"
	}
	return rules.Counted(n, "other flag")
}

func (t *Teller) arrivalLine(f *rules.FlagNews, at time.Time) string {
	if f.Kind == rules.KindRefused {
		return "Read " + clock(at, at, t.Zone) + "; it is tried again when its content or the feed's settings change"
	}
	return ""
}

// answerLine says how to answer: what to look at, and the command that settles it. A flag that is about no single value can only be seen to.
func answerLine(e event) string {
	refs, first := words(e), e[0].Ref
	switch kind := e[0].Kind; {
	case kind == rules.KindLate:
		return fmt.Sprintf("What has come: strayd explain %d. Seen to: strayd acknowledge %s", first, refs)
	case kind == rules.KindRefused && e[0].Gated:
		return fmt.Sprintf("What is behind it: strayd explain %d. Right as it is: strayd accept FILE --note WHY. Seen to: strayd acknowledge %s", first, refs)
	case kind == rules.KindMarketDay:
		return fmt.Sprintf("What is behind it: strayd explain %d. Answer: strayd decide REFS genuine --reason market-move --note WHY", first)
	case slices.Contains(rules.Concluded, kind):
		return fmt.Sprintf("What is behind it: strayd explain %d. Answer: strayd decide %s genuine | error | corrected VALUE --reason WHY --note TEXT",
			first, refs)
	}
	return fmt.Sprintf("What is behind it: strayd explain %d. Seen to: strayd acknowledge %s", first, refs)
}

// words are the refs of an event as a command takes them.
func words(e event) string {
	var refs []string
	for _, f := range e {
		refs = append(refs, fmt.Sprint(f.Ref))
	}
	return strings.Join(refs, " ")
}

func upperFirst(s string) string {
	if s == "" || s[0] < 'a' || s[0] > 'z' {
		return s
	}
	return string(s[0]-'a'+'A') + s[1:]
}

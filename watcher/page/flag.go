package page

import (
	"fmt"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// flagPage is one flag, with the others of its series and date.
type flagPage struct {
	rules.Flag
	Title   string
	Facts   []Fact
	Picture *Picture
	Beside  []rules.Flag // other flags of the series and date
	Around  *watcher.Neighbours
	Blocks  string
	Deed    *deedPart
	Status  rules.Standing
	Unsaid  bool // its causes are not weighed again here
}

// deedPart is the form by which something is done about flags.
type deedPart struct {
	Flags   []rules.Flag // that it is about
	Refs    []choice
	Can     map[string]bool // by deed
	Four    bool
	Decided *rules.Act
	Waived  *rules.Act // the waiver that waits for a second person
	Self    bool       // who looks did it
	Value   bool       // a value can be corrected
	Until   rules.Date
	Reasons []rules.Reason
	Typed   typed
	Hint    string // a value that a cause implies
}

// choice is a flag that a deed may be about too.
type choice struct {
	rules.Flag
	Chosen bool
}

func (p *Page) showFlag(v *visit) error {
	text := v.r.URL.Query().Get("ref")
	ref, err := strconv.ParseUint(text, 10, 64)
	if err != nil {
		return notThere("%q is no ref of a flag", text)
	}
	return p.flagPage(v, http.StatusOK, ref, typed{}, v.desk.hear())
}

// flagPage shows one flag, with what was typed into its form before.
func (p *Page) flagPage(v *visit, status int, ref uint64, old typed, said *Outcome) error {
	v.mayTake(actTime)
	var body *flagPage
	err := p.reading(func(view watcher.View) (err error) {
		body, err = p.readFlag(view, ref, v.r.URL.Query().Get("weigh") != "", v.desk.who, old)
		return err
	})
	if err != nil {
		return err
	}
	return v.show(status, "flag", fmt.Sprintf("Flag %d", ref), "today", body, said)
}

// mostWeighed is up to how many series a flag's causes are weighed again without being asked for: beyond, that takes seconds.
const mostWeighed = 250

func (p *Page) readFlag(view watcher.View, ref uint64, weigh bool, who rules.Person, old typed) (*flagPage, error) {
	book := p.src.Book()
	day := rules.DateFrom(p.src.Now().In(book.Zone))
	names, err := view.Names()
	if err != nil {
		return nil, err
	}
	weigh = weigh || names.Len() <= mostWeighed
	e, err := p.src.Explain(view, ref, weigh)
	if err != nil {
		return nil, err
	}
	if e == nil {
		return nil, notThere("no flag has the ref %d", ref)
	}
	out := &flagPage{Unsaid: !weigh && e.Flag.Series != "", Flag: e.Flag, Title: e.Title, Facts: e.Facts, Status: e.Flag.StandingOn(day),
		Blocks: p.blocks(&e.Flag, &book)}
	if e.Flag.Series != "" {
		if out.Beside, err = beside(view, &e.Flag); err != nil {
			return nil, err
		}
		if out.Around, err = neighbours(view, &e.Flag); err != nil {
			return nil, err
		}
		of := watcher.ChartFor(&e.Flag)
		of.To += daysAfter
		if out.Picture, err = p.src.Draw(view, of); err != nil {
			return nil, err
		}
	}
	out.Deed = newDeed(append([]rules.Flag{e.Flag}, out.Beside...), 1, who, &book, day, old)
	if e.Flag.Kind == rules.KindRefused {
		row, err := view.File(e.Flag.Step)
		if err != nil {
			return nil, err
		}
		out.Deed.Can[string(rules.Accept)] = out.Deed.Can[string(rules.Accept)] && row.Gated()
	}
	return out, nil
}

// daysAfter is up to how long after a flag's date its picture goes.
const daysAfter = 14

// mostAround is how many neighbours are listed.
const mostAround = 40

func neighbours(view watcher.View, f *rules.Flag) (*watcher.Neighbours, error) {
	r, err := watcher.NewReader(view)
	if err != nil {
		return nil, err
	}
	return r.Neighbours(f.Series, f.Date, mostAround)
}

// beside lists the other flags of a flag's series and date.
func beside(view watcher.View, f *rules.Flag) (out []rules.Flag, err error) {
	names, err := view.Names()
	if err != nil {
		return nil, err
	}
	id, ok := names.Find([]byte(f.Series))
	if !ok {
		return nil, nil
	}
	for _, kind := range rules.Kinds {
		g, ok, err := view.FlagAt(id, f.Date, kind)
		if err != nil {
			return nil, err
		}
		if ok && g.Ref != f.Ref {
			out = append(out, g)
		}
	}
	return out, nil
}

// blocks says which release a flag holds back.
func (p *Page) blocks(f *rules.Flag, book *Book) string {
	g := groupIn(book, f.Group)
	if g == nil || g.Release == nil || f.Date == rules.NoDate || f.Kind.Slow() || !f.AsksOn(rules.DateFrom(p.src.Now().In(book.Zone))) {
		return ""
	}
	at := rules.DueAt(*g.Release, f.Date, zoneOf(g.Release, book.Zone))
	when := at.In(book.Zone).Format("Mon 2 Jan 2006 15:04")
	if left := at.Sub(p.src.Now()); left > 0 {
		return "holds back the release of " + when + ", in " + until(left)
	}
	return "its release was " + when
}

// newDeed prepares the form for flags; the first of them are chosen already.
func newDeed(flags []rules.Flag, chosen int, who rules.Person, book *Book, day rules.Date, old typed) *deedPart {
	d := &deedPart{Flags: flags, Can: map[string]bool{}, Until: book.Business.Add(day, 5), Reasons: rules.Reasons, Typed: old}
	for i := range flags {
		f := &flags[i]
		tick := i < chosen || f.AsksOn(day) && f.Standing == flags[0].Standing
		if len(old.Refs) > 0 {
			tick = slices.Contains(old.Refs, f.Ref)
		}
		d.Refs = append(d.Refs, choice{*f, tick})
		if i >= chosen {
			continue
		}
		d.can(f, day)
		if g := groupIn(book, f.Group); g != nil && g.FourEyes {
			d.Four = true
		}
		if f.Decided != nil && f.Standing == rules.Decided {
			d.Decided = f.Decided
			d.Self = d.Self || f.Decided.By.UID == who.UID
		} else if f.AwaitsSecond() {
			d.Waived = f.Last
			d.Self = d.Self || f.Last.By.UID == who.UID
		}
	}
	if f := &flags[0]; chosen == 1 && f.Implied.OK && f.LooksLike != rules.CauseGenuine && f.LooksLike != rules.CauseMarket {
		d.Hint = rules.InPercent(f.Implied.V)
	}
	return d
}

// can notes what can be done about a flag as it stands.
func (d *deedPart) can(f *rules.Flag, day rules.Date) {
	standing := f.StandingOn(day)
	fits := func(deed rules.Deed, in ...rules.Standing) {
		d.Can[string(deed)] = d.Can[string(deed)] || slices.Contains(in, standing)
	}
	fits(rules.Acknowledge, rules.Open, rules.Reopened)
	fits(rules.Waive, rules.Open, rules.Reopened, rules.Acknowledged, rules.Waived)
	fits(rules.SignOff, rules.Decided)
	d.Can[string(rules.SignOff)] = d.Can[string(rules.SignOff)] || standing == rules.Waived && f.AwaitsSecond()
	if f.Kind == rules.KindRefused {
		fits(rules.Accept, rules.Open, rules.Reopened, rules.Acknowledged, rules.Waived, rules.Decided, rules.OfHistory)
	}
	d.Value = d.Value || slices.Contains(rules.Concluded, f.Kind)
}

// flagsPage is several flags that one deed is about.
type flagsPage struct {
	Deed *deedPart
	Now  time.Time
}

func (p *Page) showFlags(v *visit) error {
	refs, err := refsOf(v.r.URL.Query()["ref"])
	if err != nil {
		return err
	}
	switch len(refs) {
	case 0:
		return refusal{http.StatusBadRequest, "no flag is chosen: tick some first"}
	case 1:
		http.Redirect(v.w, v.r, v.desk.path+"/flag?ref="+strconv.FormatUint(refs[0], 10), http.StatusSeeOther)
		return nil
	}
	return p.flagsPage(v, http.StatusOK, refs, typed{}, v.desk.hear())
}

func (p *Page) flagsPage(v *visit, status int, refs []uint64, old typed, said *Outcome) error {
	book, now := p.src.Book(), p.src.Now()
	var flags []rules.Flag
	err := p.reading(func(view watcher.View) error {
		for _, ref := range refs {
			f, ok, err := view.Flag(ref)
			if err != nil {
				return err
			}
			if !ok {
				return notThere("no flag has the ref %d", ref)
			}
			flags = append(flags, f)
		}
		return nil
	})
	if err != nil {
		return err
	}
	d := newDeed(flags, len(flags), v.desk.who, &book, rules.DateFrom(now.In(book.Zone)), old)
	return v.show(status, "flags", rules.Counted(len(flags), "flag"), "today", &flagsPage{Deed: d, Now: now}, said)
}

// mostRefs is how many flags one deed on the page is about.
const mostRefs = 1000

// refsOf reads refs; one text may hold several.
func refsOf(texts []string) (refs []uint64, err error) {
	for _, text := range texts {
		for _, word := range strings.Fields(strings.ReplaceAll(text, ",", " ")) {
			ref, err := strconv.ParseUint(word, 10, 64)
			if err != nil {
				return nil, refusal{http.StatusBadRequest, fmt.Sprintf("%q is no ref of a flag", word)}
			}
			refs = append(refs, ref)
		}
	}
	slices.Sort(refs)
	if refs = slices.Compact(refs); len(refs) > mostRefs {
		return nil, refusal{http.StatusBadRequest, fmt.Sprintf("%d flags are more than the %d that one deed takes here", len(refs), mostRefs)}
	}
	return refs, nil
}

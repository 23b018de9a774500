package page

import (
	"net/http"
	"net/url"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// seriesPage is one series.
type seriesPage struct {
	Name     string
	Zone     *time.Location
	Group    string
	Owner    string
	Picture  *Picture
	Next     []watcher.Expected
	Days     []seriesDay // newest first
	Restated []restated
	Flags    []rules.Flag // newest first
	Held     int          // dates
	From, To rules.Date   // of all dates held
	Earlier  rules.Date   // where the page before begins; NoDate for none
	Later    rules.Date
}

// seriesDay is one observation under each range.
type seriesDay struct {
	Date   rules.Date
	Return rules.Units
	Rows   []watcher.Row
	Flags  []rules.Flag
}

// restated is a value with those that it took the place of.
type restated struct {
	Date     rules.Date
	Versions []version
}

// version is one value as a file brought it.
type version struct {
	Return rules.Units
	File   watcher.FileRow
	Line   uint32
}

// daysShown is how many dates of a series one page shows.
const daysShown = 60

func (p *Page) showSeries(v *visit) error {
	q := v.r.URL.Query()
	name, upto := q.Get("name"), rules.NoDate
	if text := q.Get("to"); text != "" {
		var err error
		if upto, err = rules.ParseDate(text); err != nil {
			return refusal{http.StatusBadRequest, err.Error()}
		}
	}
	if name == "" {
		return p.showNames(v)
	}
	var body *seriesPage
	err := p.reading(func(view watcher.View) (err error) {
		body, err = p.readSeries(view, name, upto)
		return err
	})
	if err != nil {
		return err
	}
	if err := p.src.Expect(name, func(e watcher.Expected) error {
		body.Next = append(body.Next, e)
		return nil
	}); err != nil {
		return err
	}
	return v.show(http.StatusOK, "series", name, "series", body, v.desk.hear())
}

func (p *Page) readSeries(view watcher.View, name string, upto rules.Date) (*seriesPage, error) {
	r, err := watcher.NewReader(view)
	if err != nil {
		return nil, err
	}
	id, ok := r.Names.Find([]byte(name))
	if !ok {
		return nil, &watcher.UnknownSeries{Series: name}
	}
	versions, err := view.Series(watcher.Returns, id)
	if err != nil {
		return nil, err
	}
	out := &seriesPage{Name: name, Zone: p.src.Book().Zone, Earlier: rules.NoDate, Later: rules.NoDate, From: rules.NoDate, To: rules.NoDate}
	dates := datesOf(versions)
	if out.Held = len(dates); out.Held == 0 {
		return out, nil
	}
	out.From, out.To = dates[0], dates[len(dates)-1]
	shown := out.cut(dates, upto)
	rows, err := r.History(name, shown[0], shown[len(shown)-1])
	if err != nil {
		return nil, err
	}
	out.days(rows)
	if err := out.flags(view, id); err != nil {
		return nil, err
	}
	if owner := p.src.Book().Owner; owner != nil {
		out.Owner = owner(name)
	}
	if len(out.Days) > 0 {
		if out.Picture, err = p.src.Draw(view, watcher.ChartOf{Series: name, Marked: rules.NoDate, To: shown[len(shown)-1]}); err != nil {
			return nil, err
		}
	}
	return out, out.restatements(r, versions, shown[0], shown[len(shown)-1])
}

func datesOf(versions []watcher.Version) (out []rules.Date) {
	for i, v := range versions {
		if i == 0 || versions[i-1].Date != v.Date {
			out = append(out, v.Date)
		}
	}
	return out
}

// cut takes the dates to show: the last ones up to a date.
func (s *seriesPage) cut(dates []rules.Date, upto rules.Date) []rules.Date {
	end := len(dates)
	for upto != rules.NoDate && end > 1 && dates[end-1] > upto {
		end--
	}
	from := max(0, end-daysShown)
	if from > 0 {
		s.Earlier = dates[from-1]
	}
	if end < len(dates) {
		s.Later = dates[min(end+daysShown, len(dates))-1]
	}
	return dates[from:end]
}

// days puts the rows of each date together, newest first.
func (s *seriesPage) days(rows []watcher.Row) {
	for i := len(rows) - 1; i >= 0; i-- {
		r := rows[i]
		s.Group = r.Group
		if n := len(s.Days); n == 0 || s.Days[n-1].Date != r.Date {
			s.Days = append(s.Days, seriesDay{Date: r.Date, Return: r.Return})
		}
		d := &s.Days[len(s.Days)-1]
		d.Rows = append([]watcher.Row{r}, d.Rows...)
	}
}

// flags finds the flags of the dates shown.
func (s *seriesPage) flags(view watcher.View, id uint32) error {
	for n := range s.Days {
		d := &s.Days[n]
		for _, kind := range rules.Kinds {
			f, ok, err := view.FlagAt(id, d.Date, kind)
			if err != nil {
				return err
			}
			if ok {
				d.Flags = append(d.Flags, f)
			}
		}
		s.Flags = append(s.Flags, d.Flags...)
	}
	return nil
}

// restatements lists the dates shown that have more than one version.
func (s *seriesPage) restatements(r *watcher.Reader, versions []watcher.Version, from, to rules.Date) error {
	for i := 0; i < len(versions); {
		end := i + 1
		for end < len(versions) && versions[end].Date == versions[i].Date {
			end++
		}
		if date := versions[i].Date; end > i+1 && date >= from && date <= to {
			one := restated{Date: date}
			for _, v := range versions[i:end] {
				file, err := r.File(v.Step)
				if err != nil {
					return err
				}
				one.Versions = append(one.Versions, version{rules.Units(v.Value), file, v.Line})
			}
			s.Restated = append(s.Restated, one)
		}
		i = end
	}
	return nil
}

// namesPage is the list of all series.
type namesPage struct {
	Part  string // that is looked for
	Names []string
	All   int
	Fit   int
}

// mostNames is how many series a list shows.
const mostNames = 500

func (p *Page) showNames(v *visit) error {
	body := &namesPage{Part: v.r.URL.Query().Get("part")}
	err := p.reading(func(view watcher.View) error {
		names, err := view.Names()
		if err != nil {
			return err
		}
		body.All = names.Len()
		for id := range uint32(names.Len()) {
			name := string(names.Name(id))
			if !strings.Contains(strings.ToLower(name), strings.ToLower(body.Part)) {
				continue
			}
			if body.Fit++; len(body.Names) < mostNames {
				body.Names = append(body.Names, name)
			}
		}
		return nil
	})
	if err != nil {
		return err
	}
	if body.Fit == 1 && body.Part != "" {
		http.Redirect(v.w, v.r, v.desk.path+"/series?name="+url.QueryEscape(body.Names[0]), http.StatusSeeOther)
		return nil
	}
	return v.show(http.StatusOK, "names", "Series", "series", body, v.desk.hear())
}

package page

import (
	"fmt"
	"net/http"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// feedsPage is all feeds.
type feedsPage struct {
	Zone  *time.Location
	Feeds []feedRecord
}

// feedRecord is one feed with what came of it.
type feedRecord struct {
	feedToday
	Files    []watcher.FileRow // newest first
	Weeks    []rules.FeedWeek  // oldest first
	Names    []string          // of the weeks
	All      rules.FeedWeek
	Deadline string
}

// filesShown is how many files of a feed are listed.
const filesShown = 20

func (p *Page) showFeeds(v *visit) error {
	book, now := p.src.Book(), p.src.Now()
	facts, err := p.feedFacts(&book, now)
	if err != nil {
		return err
	}
	body := &feedsPage{Zone: book.Zone}
	for i := range book.Feeds {
		body.Feeds = append(body.Feeds, facts.record(&book.Feeds[i], &book, now))
	}
	return v.show(http.StatusOK, "feeds", "Feeds", "feeds", body, v.desk.hear())
}

// feedFacts are the files and late flags of the weeks that the record covers.
type feedFacts struct {
	files map[string][]watcher.FileRow
	week  *rules.WeekFacts
}

func (p *Page) feedFacts(book *Book, now time.Time) (*feedFacts, error) {
	out := &feedFacts{files: map[string][]watcher.FileRow{}}
	out.week = &rules.WeekFacts{Span: thisWeek(now, book.Zone), Zone: book.Zone, Calendar: book.Business}
	err := p.reading(func(view watcher.View) error {
		if err := view.Files(func(f watcher.FileRow) bool {
			if !f.Fileless() {
				out.files[f.File.Feed] = append(out.files[f.File.Feed], f)
				out.week.Files = append(out.week.Files, rules.WeekFile{Feed: f.File.Feed, At: f.Received, Refused: f.Outcome == watcher.Refused,
					Rows: f.Counts.Rows, Restated: f.Counts.Restated, Last: f.Last})
			}
			return true
		}); err != nil {
			return err
		}
		late := func(h watcher.FlagHead) bool { return h.Kind == rules.KindLate }
		return view.FlagsOf(true, late, func(f rules.Flag) bool {
			out.week.Flags = append(out.week.Flags, f)
			return true
		})
	})
	return out, err
}

// record is one feed as the page shows it.
func (x *feedFacts) record(f *rules.Feed, book *Book, now time.Time) feedRecord {
	files := x.files[f.Name]
	a := &arrival{}
	today := startOf(now.In(book.Zone))
	for _, row := range files {
		a.take(row, today)
	}
	out := feedRecord{feedToday: feedOf(f, a, now, book.Zone)}
	for n := len(files) - 1; n >= 0 && len(out.Files) < filesShown; n-- {
		out.Files = append(out.Files, files[n])
	}
	figures := x.week.FeedRecord(f)
	out.Weeks, out.All = figures.Weeks, figures.All
	for back := len(out.Weeks) - 1; back >= 0; back-- {
		out.Names = append(out.Names, rules.WeekName(x.week.Span.Monday-rules.Date(7*back)))
	}
	if f.Due != nil {
		out.Deadline = deadlineWords(f.Due)
	}
	return out
}

// deadlineWords say when a feed must be whole.
func deadlineWords(d *rules.Due) string {
	s := fmt.Sprintf("by %02d:%02d", d.Minutes/60, d.Minutes%60)
	if d.Timezone != "" {
		s += " " + d.Timezone
	}
	switch d.Days {
	case 0:
		return s + " on the valuation date"
	case 1:
		return s + " on the business day after"
	}
	return fmt.Sprintf("%s, %d business days after", s, d.Days)
}

// thisWeek is the week that a moment lies in.
func thisWeek(now time.Time, zone *time.Location) rules.WeekSpan {
	day := rules.DateFrom(now.In(zone))
	return rules.NewWeekSpan(day-rules.Date((int(day.Weekday())+6)%7), now, zone)
}

package page

import (
	"context"
	"html/template"
	"io/fs"
	"log/slog"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// Sources are what the page needs of the program around it. All of them may be called from many goroutines.
type Sources struct {
	Now  func() time.Time
	View func() (watcher.View, error)
	Book func() Book
	// Explain is what stands behind a flag, nil where there is none. To weigh its causes again reads the past of all series with a group.
	Explain func(v watcher.View, ref uint64, weigh bool) (*Evidence, error)
	// Do carries out a command line for a person and gives all that it said.
	Do func(ctx context.Context, who rules.Person, args []string) (ok bool, text string)
	// Expect calls each with what would be in range next for a series.
	Expect  func(series string, each func(watcher.Expected) error) error
	Draw    func(v watcher.View, of watcher.ChartOf) (*Picture, error)
	Host    func(hostport string) bool // a Host that is ours: a loopback name, or the proxy's
	Proxied func(Asked) (who rules.Person, ok bool)
	Log     *slog.Logger
}

// Asked is what a request says of itself that a proxy may vouch for.
type Asked struct {
	Host   string
	Header func(name string) string
}

// Book is what the configuration in force says.
type Book struct {
	Zone     *time.Location
	Groups   []rules.Group
	Feeds    []rules.Feed
	Business *rules.Calendar
	Owner    func(series string) string // "" for none
	Troubles []string                   // channels that do not deliver, each in a sentence
	Weeks    fs.FS                      // the archived weekly logs
}

// Evidence is all that stands behind a flag, as the command explain says it.
type Evidence struct {
	Flag  rules.Flag
	Title string // the verdict in a line; of a flag about a file, all that there is to say
	Facts []Fact
}

// Picture is a drawing of a series with its range, for wide and for narrow screens, and what it shows in words.
type Picture struct {
	Wide, Narrow template.HTML
	Text         string
}

// Fact is one labelled line of evidence.
type Fact struct{ Name, Text string }

// Outcome is what a deed brought about, or why it did not.
type Outcome struct {
	OK    bool
	Lines []string
}

// Page serves the desk's page.
type Page struct {
	src   Sources
	door  *door
	pages map[string]*template.Template
	today today
}

// New makes a page. Nobody is at it yet.
func New(src Sources) (*Page, error) {
	pages, err := parsePages()
	if err != nil {
		return nil, err
	}
	return &Page{src: src, door: newDoor(src.Now), pages: pages}, nil
}

// Invite makes the path of a link for a person, to go behind the address of the listener.
func (p *Page) Invite(who rules.Person) string { return enterPath + "?link=" + p.door.invite(who) }

// LinkTime is how long a link waits to be taken up.
func LinkTime() time.Duration { return linkTime }

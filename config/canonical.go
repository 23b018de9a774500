package config

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"slices"

	"strayd/rules"
)

// FeedKey is a hash of everything that changes how the content of a feed's files is read. Where the files lie, when they are
// looked for and when they are due is not part of it; nor is the feed's name.
func FeedKey(f rules.Feed) string {
	return hash(struct {
		Form           int
		Layout, Value  string
		Columns        rules.Columns
		Unit, Date     string
		Decimal, Split string
		Encoding       string
		Missing        []string
		Skip           float64
	}{1, string(f.Layout), string(f.Value), f.Columns, string(f.Unit), f.DateStyle, string(f.Decimal), string(f.Separator),
		f.Encoding, ordered(f.Missing), f.SkipShare})
}

// FeedKey is FeedKey of the feed of that name, "" when there is none.
func (c *Config) FeedKey(name string) string {
	i := slices.IndexFunc(c.Feeds, func(f rules.Feed) bool { return f.Name == name })
	if i < 0 {
		return ""
	}
	return FeedKey(c.Feeds[i])
}

type judging struct {
	Form     int           `json:"form"` // of this JSON
	Calendar string        `json:"calendar"`
	Doubtful float64       `json:"doubtful"`
	Groups   []judgedGroup `json:"groups"`
	Ranges   []judgedRange `json:"ranges"`
}

type judgedGroup struct {
	Name      string   `json:"name"`
	Series    []string `json:"series"`
	Reference string   `json:"reference"`
}

type judgedRange struct {
	Name  string     `json:"name"`
	Of    string     `json:"of"`
	For   []string   `json:"for"`
	Limit []string   `json:"limit,omitempty"`
	Own   *judgedOwn `json:"own,omitempty"`
}

type judgedOwn struct {
	Window     int        `json:"window"`
	Scale      string     `json:"scale"`
	Decay      float64    `json:"decay,omitempty"`
	Tail       string     `json:"tail"`
	DF         float64    `json:"df,omitempty"`
	Predictive bool       `json:"predictive"`
	Side       string     `json:"side"`
	Watch      judgedLine `json:"watch"`
	Breach     judgedLine `json:"breach"`
	Pending    string     `json:"pending"`
}

type judgedLine struct {
	Tail       float64 `json:"tail,omitempty"`
	Confidence float64 `json:"confidence,omitempty"`
	Z          float64 `json:"z,omitempty"`
	Budget     float64 `json:"budget,omitempty"`
}

// Judging is a canonical JSON of what decides verdicts: calendar, groups, ranges and limits with every default filled in. Two
// files that differ only in comments, layout, key order, or the order of a set give the same bytes; the order of groups and of
// ranges counts, as results are listed in it.
func (c *Config) Judging() []byte {
	j := judging{Form: 1, Calendar: c.Calendar.Name, Doubtful: c.Doubtful, Groups: []judgedGroup{}, Ranges: []judgedRange{}}
	for _, g := range c.Groups {
		j.Groups = append(j.Groups, judgedGroup{g.Name, ordered(g.Series), g.Reference})
	}
	for _, r := range c.Ranges {
		j.Ranges = append(j.Ranges, judged(r))
	}
	return encode(j)
}

func judged(r rules.Range) judgedRange {
	out := judgedRange{Name: r.Name, Of: string(r.Of), For: ordered(r.For)}
	if r.Limit != nil {
		out.Limit = []string{r.Limit.Low.String(), r.Limit.High.String()}
		return out
	}
	own := judgedOwn{Window: r.Window, Scale: string(r.Scale), Tail: r.Tail.Name, DF: r.Tail.DF, Predictive: r.Predictive && r.Scale == rules.Plain,
		Side: string(r.Side), Watch: line(r.Watch), Breach: line(r.Breach), Pending: string(r.Pending)}
	if r.Scale == rules.Weighted {
		own.Decay = r.Decay
	}
	out.Own = &own
	return out
}

func line(l rules.Line) judgedLine {
	return judgedLine{Tail: l.Tail, Confidence: l.Confidence, Z: l.Z, Budget: l.Budget}
}

// ordered is a sorted copy of a set, never nil.
func ordered(set []string) []string {
	out := append([]string{}, set...)
	slices.Sort(out)
	return out
}

func hash(v any) string {
	sum := sha256.Sum256(encode(v))
	return hex.EncodeToString(sum[:])
}

func encode(v any) []byte {
	text, err := json.Marshal(v)
	if err != nil {
		panic(err) // finite numbers, strings and lists only
	}
	return text
}

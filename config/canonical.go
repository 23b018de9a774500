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
		Sheet          string `json:",omitempty"`
	}{1, string(f.Layout), string(f.Value), f.Columns, string(f.Unit), f.DateStyle, string(f.Decimal), string(f.Separator),
		f.Encoding, ordered(f.Missing), f.SkipShare, f.Sheet})
}

// FeedKey is FeedKey of the feed of that name, "" when there is none.
func (c *Config) FeedKey(name string) string {
	i := slices.IndexFunc(c.Feeds, func(f rules.Feed) bool { return f.Name == name })
	if i < 0 {
		return ""
	}
	return FeedKey(c.Feeds[i])
}

// Settings is what decides verdicts. The register's groups are not in it: they are read from its file.
func (c *Config) Settings() rules.Settings {
	return rules.Settings{Ranges: c.Ranges, Groups: c.Groups, Doubtful: c.Doubtful, Calendar: c.Calendar.Name}
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

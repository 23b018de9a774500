package rules

import (
	"encoding/json"
	"fmt"
	"slices"
)

// Entry is an act as it stands in the record, with all that it was about and brought about.
type Entry struct {
	Act
	Refs   []uint64
	Second []uint64 // the refs whose group asks for four eyes; Act.Second says it of one flag
	File   string   // the released file and its feed, of accept
	Feed   string
	SHA256 string    // of its content, in hex
	Differ []Differs // at most MostDiffer
	More   int       // how many differ beyond those
}

// MostDiffer is how many differing observations an entry names.
const MostDiffer = 1000

// Differs is an observation of which the windows, replayed after a decision, say otherwise than the verdict that was issued. That
// verdict stands.
type Differs struct {
	Series string
	Date   Date
	Range  string
	Issued Finding
	Now    Finding
}

// entryText is the form of an entry in the record. Its keys are read by other programs.
type entryText struct {
	Act        Deed          `json:"act"`
	Step       uint32        `json:"step"`
	Refs       []uint64      `json:"refs,omitempty"`
	UID        int           `json:"uid"`
	Name       string        `json:"name,omitempty"`
	Root       bool          `json:"root,omitempty"`
	Conclusion Conclusion    `json:"conclusion,omitempty"`
	Value      string        `json:"value,omitempty"`
	Reason     Reason        `json:"reason,omitempty"`
	Note       string        `json:"note,omitempty"`
	Override   string        `json:"override,omitempty"`
	Until      string        `json:"until,omitempty"`
	Second     []uint64      `json:"second,omitempty"`
	Feed       string        `json:"feed,omitempty"`
	File       string        `json:"file,omitempty"`
	SHA256     string        `json:"sha256,omitempty"`
	Differ     []differsText `json:"differ,omitempty"`
	More       int           `json:"more,omitempty"`
}

type differsText struct {
	Series string  `json:"series"`
	Date   string  `json:"date"`
	Range  string  `json:"range"`
	Issued Finding `json:"issued"`
	Now    Finding `json:"now"`
}

// Text is the body of the entry in the record. Who and when stand beside it there.
func (e *Entry) Text() []byte {
	t := entryText{Act: e.Deed, Step: e.Step, Refs: e.Refs, UID: e.By.UID, Name: e.By.Name, Root: e.By.Root(), Conclusion: e.Conclusion,
		Value: e.Value.String(), Reason: e.Reason, Note: e.Note, Override: e.Override, Until: e.Until.String(), Second: e.Second, Feed: e.Feed,
		File: e.File, SHA256: e.SHA256, More: e.More}
	for _, d := range e.Differ {
		t.Differ = append(t.Differ, differsText{d.Series, d.Date.String(), d.Range, d.Issued, d.Now})
	}
	return encode(t)
}

// ParseEntry reads the body of an entry of the record.
func ParseEntry(body []byte) (*Entry, error) {
	var t entryText
	if err := json.Unmarshal(body, &t); err != nil {
		return nil, fmt.Errorf("entry of the record: %w", err)
	}
	if !slices.Contains(Deeds, t.Act) {
		return nil, fmt.Errorf("entry of the record: act %q is not known", t.Act)
	}
	e := &Entry{Refs: t.Refs, Second: t.Second, Feed: t.Feed, File: t.File, SHA256: t.SHA256, More: t.More}
	e.Act = Act{Deed: t.Act, Step: t.Step, By: Person{t.UID, t.Name}, Conclusion: t.Conclusion, Value: Missing, Reason: t.Reason, Note: t.Note,
		Override: t.Override, Until: NoDate}
	var err error
	if t.Value != "" {
		if e.Value, err = ParseUnits(t.Value); err != nil {
			return nil, fmt.Errorf("entry of the record: %w", err)
		}
	}
	if e.Until, err = dateOrNone(t.Until); err != nil {
		return nil, err
	}
	for _, d := range t.Differ {
		date, err := dateOrNone(d.Date)
		if err != nil {
			return nil, err
		}
		e.Differ = append(e.Differ, Differs{d.Series, date, d.Range, d.Issued, d.Now})
	}
	return e, nil
}

// Of is the act as it stands on one flag; ok is false when the entry is not about it.
func (e *Entry) Of(ref uint64) (a Act, ok bool) {
	a = e.Act
	a.Second = slices.Contains(e.Second, ref)
	return a, slices.Contains(e.Refs, ref)
}

func dateOrNone(s string) (Date, error) {
	if s == "" {
		return NoDate, nil
	}
	d, err := ParseDate(s)
	if err != nil {
		return NoDate, fmt.Errorf("entry of the record: %w", err)
	}
	return d, nil
}

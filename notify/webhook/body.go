package webhook

import (
	"encoding/json"
	"strings"
	"time"

	"strayd/notify"
	"strayd/rules"
)

// form is the version of the JSON that is sent. Keys are added under the same version; a changed meaning is a new one.
const form = 1

// body is what is sent. Its keys are read by other programs.
type body struct {
	Version int        `json:"version"`
	Key     string     `json:"key"`     // the identity of the notice, as in the header
	Notice  uint64     `json:"notice"`  // its number in `strayd notices`
	Channel string     `json:"channel"` // the channel that delivers it
	For     string     `json:"for"`     // the channel it was made for, when this one stands in; else empty
	Kind    rules.Kind `json:"kind"`
	Date    *string    `json:"date"` // valuation date, null when it is about none
	Refs    []uint64   `json:"refs"` // of the flags it tells of, never null
	Made    string     `json:"made"` // RFC 3339, UTC
	Repeat  bool       `json:"repeat"`
	Text    string     `json:"text"`  // the lines, joined
	Lines   []string   `json:"lines"` // plain text from other people's files: escape it for your medium
}

// Body is the JSON of a notice.
func Body(n rules.Notice) []byte {
	b := body{Version: form, Key: notify.Identity(n), Notice: n.Number, Channel: n.Channel, For: n.For, Kind: n.Kind, Refs: n.Refs,
		Made: n.Made.UTC().Format(time.RFC3339), Repeat: n.Repeat, Text: strings.Join(n.Lines, "\n"), Lines: n.Lines}
	if n.Date != rules.NoDate {
		date := n.Date.String()
		b.Date = &date
	}
	if b.Refs == nil {
		b.Refs = []uint64{}
	}
	text, err := json.Marshal(b)
	if err != nil {
		panic(err) // plain values always encode
	}
	return text
}

package notify

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"

	"strayd/rules"
)

// key is the hash under which a notice is enqueued at most once. It is a hash so that a channel may be handed it: it tells nothing
// of a value.
func key(parts ...any) string {
	h := sha256.New()
	for _, p := range parts {
		text := fmt.Sprint(p)
		fmt.Fprintf(h, "%d:%s", len(text), text) // lengths, so that no two lists of parts run together alike
	}
	return hex.EncodeToString(h.Sum(nil)[:16])
}

// eventKey tells one event from another: the same step told again gives the same key, a value restated in a later step another.
func eventKey(c rules.Channel, e event) string {
	parts := []any{c.Name}
	for _, f := range e {
		parts = append(parts, f.Kind, f.Series, f.Group, f.Date, f.Feed)
		if f.Kind != rules.KindLate { // a feed is late once for a date, whatever happens later
			parts = append(parts, f.Step, f.File, f.Line, f.Return, f.Note)
		}
	}
	return key(parts...)
}

// Identity names a notice to whoever receives it, so that an attempt that is repeated is known for the same message. A notice that a
// person sends once more is another message.
func Identity(n rules.Notice) string {
	if n.Ended.IsZero() {
		return n.Key
	}
	return fmt.Sprintf("%s-%d", n.Key, n.Ended.Unix())
}

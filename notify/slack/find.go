package slack

import (
	"context"
	"fmt"
	"time"

	"github.com/slack-go/slack"

	"strayd/notify"
	"strayd/rules"
)

const (
	pageSize  = 200
	pagesMost = 5
	// skew is how far the service's clock may be behind ours.
	skew = time.Minute
)

// Find looks for the notice among the channel's messages since its attempts. It is sure that the notice is not there only when it
// can read what identifies messages: the token has that scope, or such a message was seen.
func (c *Channel) Find(ctx context.Context, n rules.Notice) (notify.Found, string) {
	if n.Under != "" { // the messages of a channel are read without those of its threads
		return notify.FoundUnknown, ""
	}
	params := &slack.GetConversationHistoryParameters{ChannelID: c.id, Oldest: stamp(attempted(n).Add(-skew)), Limit: pageSize,
		IncludeAllMetadata: true}
	readable := false
	for range pagesMost {
		page, err := c.s.api().GetConversationHistoryContext(ctx, params)
		if err != nil || !page.Ok {
			return notify.FoundUnknown, ""
		}
		for _, m := range page.Messages {
			if m.Metadata.EventType != eventType {
				continue
			}
			readable = true
			if m.Metadata.EventPayload[payloadKey] == n.Key && m.Metadata.EventPayload[payloadNum] == fmt.Sprint(n.Number) {
				return notify.FoundThere, c.id + "/" + m.Timestamp
			}
		}
		params.Cursor = page.ResponseMetaData.NextCursor
		if params.Cursor == "" {
			if page.HasMore || !readable && !c.s.has("metadata.message:read") {
				return notify.FoundUnknown, ""
			}
			return notify.FoundNot, ""
		}
	}
	return notify.FoundUnknown, ""
}

// attempted is when the earliest attempt can have been made.
func attempted(n rules.Notice) time.Time {
	if n.Attempts > 1 {
		return n.Made
	}
	return n.Started
}

// stamp writes a time as the service's messages are stamped: seconds with six decimals.
func stamp(t time.Time) string { return fmt.Sprintf("%d.%06d", t.Unix(), t.Nanosecond()/1000) }

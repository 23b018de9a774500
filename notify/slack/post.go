package slack

import (
	"context"
	"fmt"
	"net/http/httptrace"
	"strings"
	"sync/atomic"

	"github.com/slack-go/slack"

	"strayd/notify"
	"strayd/rules"
)

const (
	eventType  = "strayd_notice"
	payloadKey = "key"
	payloadNum = "notice"
)

// Post makes one attempt. The receipt is "channel/time stamp", which names the message for good.
func (c *Channel) Post(ctx context.Context, n rules.Notice) (string, error) {
	return c.post(ctx, n,
		slack.MsgOptionBlocks(blocks(n.Lines)...),
		slack.MsgOptionMetadata(slack.SlackMetadata{EventType: eventType,
			EventPayload: map[string]any{payloadKey: n.Key, payloadNum: fmt.Sprint(n.Number)}}))
}

// PostPlain makes one attempt with the text alone, in no thread: the message that it would go under may be gone.
func (c *Channel) PostPlain(ctx context.Context, n rules.Notice) (string, error) {
	n.Under = ""
	return c.post(ctx, n)
}

func (c *Channel) post(ctx context.Context, n rules.Notice, more ...slack.MsgOption) (string, error) {
	if of, stamp, ok := strings.Cut(n.Under, "/"); ok && of == c.id {
		more = append(more, slack.MsgOptionTS(stamp))
		if n.Kind != rules.KindUpdate { // it asks something: the channel is to see it, too
			more = append(more, slack.MsgOptionBroadcast())
		}
	}
	ctx, connected := traced(ctx)
	channel, stamp, err := c.s.api().PostMessageContext(ctx, c.id, append(more,
		slack.MsgOptionText(fallback(n.Lines), false), // escaped already
		slack.MsgOptionDisableMarkdown(), slack.MsgOptionDisableLinkUnfurl(), slack.MsgOptionDisableMediaUnfurl())...)
	switch {
	case err != nil:
		return "", c.s.classify(err, connected.Load())
	case channel == "" || stamp == "":
		return "", &notify.Failure{Class: notify.Ambiguous, Reason: "the answer names no message"}
	}
	return channel + "/" + stamp, nil
}

// traced notes whether a call got as far as a connection, encrypted where it should be: before that nothing can have been sent.
func traced(ctx context.Context) (context.Context, *atomic.Bool) {
	connected := new(atomic.Bool)
	return httptrace.WithClientTrace(ctx, &httptrace.ClientTrace{GotConn: func(httptrace.GotConnInfo) { connected.Store(true) }}), connected
}

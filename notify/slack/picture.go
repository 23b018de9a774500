package slack

import (
	"bytes"
	"context"
	"errors"
	"strings"

	"github.com/slack-go/slack"

	"strayd/notify"
	"strayd/rules"
)

// attachScope is the permission that pictures need.
const attachScope = "files:write"

// Attach uploads a picture into the thread of a notice's message, in one attempt: an address is asked for, the picture goes there, and the
// upload is completed, which is when it shows.
func (c *Channel) Attach(ctx context.Context, n rules.Notice, p *notify.Picture) error {
	of, stamp, ok := strings.Cut(n.Receipt, "/")
	if !ok {
		return errors.New("the receipt names no message")
	}
	if c.s.scopes.Load() != nil && !c.s.has(attachScope) {
		return &notify.Failure{Class: notify.DeadAll, Reason: "missing_scope: " + hints["missing_scope"] + " (" + attachScope + ")"}
	}
	ctx, connected := traced(ctx)
	_, err := c.s.api().UploadFileContext(ctx, slack.UploadFileParameters{Reader: bytes.NewReader(p.PNG), FileSize: len(p.PNG), Filename: p.Name,
		Title: p.Name, AltTxt: p.Text, Channel: of, ThreadTimestamp: stamp})
	if err != nil {
		return c.s.classify(err, connected.Load())
	}
	return nil
}

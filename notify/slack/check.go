package slack

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"github.com/slack-go/slack"
)

// Access is what the token may do in a channel.
type Access struct {
	Team   string
	User   string // the app's own name there
	Name   string // the channel's name, "" when the token may not ask
	Member bool
	Finds  bool // it can be told whether a message whose answer was lost has arrived
	Notes  []string
}

// String says it in a line.
func (a Access) String() string {
	s := fmt.Sprintf("workspace %q as %q", a.Team, a.User)
	if a.Name != "" {
		s += ", channel #" + a.Name
	}
	if a.Finds {
		s += "; finds out whether a message arrived when its answer is lost"
	}
	return strings.Join(append([]string{s}, a.Notes...), "; ")
}

// Check asks the service who the token is, what it may do, and whether it may post to the channel. Nothing is posted. The error is
// what keeps notices from arriving.
func (c *Channel) Check(ctx context.Context) (Access, error) {
	var a Access
	ctx, connected := traced(ctx)
	auth, err := c.s.api().AuthTestContext(ctx)
	if err != nil {
		return a, errors.New(c.s.classify(err, connected.Load()).Reason)
	}
	if auth.UserID == "" && auth.User == "" {
		return a, errors.New("the answer does not say who the token is: something else answers in the service's place")
	}
	a.Team, a.User = auth.Team, auth.User
	known := c.s.scopes.Load() != nil
	if known && !c.s.has("chat:write") {
		return a, errors.New("missing_scope: the app lacks a permission (chat:write)")
	}
	a.Finds = c.s.has("metadata.message:read") && (c.s.has("channels:history") || c.s.has("groups:history"))
	if known && !a.Finds {
		a.Notes = append(a.Notes, "without the permissions channels:history (groups:history) and metadata.message:read "+
			"a message whose answer is lost is sent again as a possible repeat")
	}
	if known && !c.s.has(attachScope) {
		a.Notes = append(a.Notes, "without the permission "+attachScope+" no chart goes with an alert")
	}
	return a, c.checkChannel(ctx, &a)
}

func (c *Channel) checkChannel(ctx context.Context, a *Access) error {
	info, err := c.s.api().GetConversationInfoContext(ctx, &slack.GetConversationInfoInput{ChannelID: c.id})
	var answer slack.SlackErrorResponse
	switch {
	case errors.As(err, &answer) && answer.Err == "missing_scope":
		a.Notes = append(a.Notes, "whether the app is in the channel could not be asked (channels:read, groups:read)")
		return nil
	case err != nil:
		return errors.New(c.s.classify(err, true).Reason)
	case info.ID == "":
		return errors.New("the answer names no channel: something else answers in the service's place")
	}
	a.Name, a.Member = info.Name, info.IsMember
	switch {
	case info.IsArchived:
		return errors.New("is_archived: " + hints["is_archived"])
	case !info.IsMember && (info.IsPrivate || !c.s.has("chat:write.public")):
		return errors.New("not_in_channel: " + hints["not_in_channel"])
	}
	return nil
}

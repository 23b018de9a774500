package slack

import (
	"context"
	"fmt"
	"strings"
	"testing"
)

func TestCheck(t *testing.T) {
	for what, c := range map[string]struct {
		change func(*fake)
		says   string // within the line, or the error
		fails  bool
	}{
		"all well":          {func(*fake) {}, `workspace "Example" as "strayd", channel #returns; finds out whether`, false},
		"cannot find":       {func(f *fake) { f.scopes = "chat:write,channels:read" }, "as a possible repeat", false},
		"cannot write":      {func(f *fake) { f.scopes = "channels:read" }, "chat:write", true},
		"not in it":         {func(f *fake) { f.channel = `"name":"returns"` }, "not_in_channel: invite the app", true},
		"not in it, public": {func(f *fake) { f.channel = `"name":"returns"`; f.scopes = "chat:write,chat:write.public" }, "#returns", false},
		"not in it, private": {func(f *fake) {
			f.channel = `"name":"returns","is_private":true`
			f.scopes = "chat:write,chat:write.public"
		}, "not_in_channel", true},
		"archived":      {func(f *fake) { f.channel = `"name":"returns","is_member":true,"is_archived":true` }, "is_archived", true},
		"unknown id":    {func(f *fake) { f.then("conversations.info", answer(200, `{"ok":false,"error":"channel_not_found"}`)) }, "channel_not_found: the id", true},
		"may not ask":   {func(f *fake) { f.then("conversations.info", answer(200, `{"ok":false,"error":"missing_scope"}`)) }, "could not be asked", false},
		"bad token":     {func(f *fake) { f.then("auth.test", answer(200, `{"ok":false,"error":"invalid_auth"}`)) }, "invalid_auth: the token", true},
		"portal":        {func(f *fake) { f.then("auth.test", answer(200, `{}`)) }, "something else answers", true},
		"portal, later": {func(f *fake) { f.then("conversations.info", answer(200, `{}`)) }, "something else answers", true},
		"down":          {func(f *fake) { f.Close() }, "not reached: ", true},
	} {
		f := newFake(t)
		c.change(f)
		a, err := channelOf(t, f, Options{}).Check(context.Background())
		if got := fmt.Sprint(a, err); !strings.Contains(got, c.says) || (err != nil) != c.fails {
			t.Errorf("%s: %s", what, got)
		}
		if f.count("chat.postMessage") != 0 {
			t.Errorf("%s: something was posted", what)
		}
	}
}

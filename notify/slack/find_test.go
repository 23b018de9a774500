package slack

import (
	"context"
	"net/http"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

func TestFind(t *testing.T) {
	ctx := context.Background()
	other := notice
	other.Number, other.Key = 13, "ffff"
	sameKey := notice
	sameKey.Number = 14
	post := func(c *Channel, ns ...rules.Notice) {
		for _, n := range ns {
			if _, err := c.Post(ctx, n); err != nil {
				t.Fatal(err)
			}
		}
	}
	t.Run("there, on the last page", func(t *testing.T) {
		f := newFake(t)
		c := channelOf(t, f, Options{})
		post(c, notice, other, other, sameKey, other)
		found, receipt := c.Find(ctx, notice)
		if found != notify.FoundThere || receipt != target+"/"+f.messages[0].Stamp {
			t.Errorf("%v %q", found, receipt)
		}
		form := f.calls["conversations.history"][0]
		if want := stamp(notice.Started.Add(-time.Minute)); form.Get("oldest") != want {
			t.Errorf("oldest %q, want %q", form.Get("oldest"), want)
		}
		if form.Get("limit") != "200" || form.Get("include_all_metadata") != "1" {
			t.Errorf("asked with %v", form)
		}
		if f.count("conversations.history") != 3 {
			t.Errorf("%d pages", f.count("conversations.history"))
		}
	})
	t.Run("lost answer", func(t *testing.T) {
		f := newFake(t)
		f.then("chat.postMessage", f.lost)
		c := channelOf(t, f, Options{})
		if _, err := c.Post(ctx, notice); class(err) != notify.Ambiguous {
			t.Fatal(err)
		}
		if found, _ := c.Find(ctx, notice); found != notify.FoundThere {
			t.Error(found)
		}
	})
	t.Run("after several attempts, since it was made", func(t *testing.T) {
		f := newFake(t)
		n := notice
		n.Attempts = 2
		channelOf(t, f, Options{}).Find(ctx, n)
		if got, want := f.calls["conversations.history"][0].Get("oldest"), stamp(n.Made.Add(-time.Minute)); got != want {
			t.Errorf("oldest %q, want %q", got, want)
		}
	})
	for what, c := range map[string]struct {
		scopes string
		posted []rules.Notice
		step   http.HandlerFunc
		want   notify.Found
	}{
		"not there":                            {"chat:write,channels:history,metadata.message:read", []rules.Notice{other}, nil, notify.FoundNot},
		"nothing there, scope known":           {"channels:history, metadata.message:read", nil, nil, notify.FoundNot},
		"nothing there, metadata unreadable":   {"channels:history", nil, nil, notify.FoundUnknown},
		"it is there, but metadata unreadable": {"channels:history", []rules.Notice{notice}, nil, notify.FoundUnknown},
		"no scopes told, others seen":          {"", nil, answer(200, `{"ok":true,"messages":[{"ts":"9.9","metadata":{"event_type":"strayd_notice","event_payload":{"key":"x"}}}]}`), notify.FoundNot},
		"no scopes told, none seen":            {"", nil, nil, notify.FoundUnknown},
		"missing scope":                        {"chat:write", nil, answer(200, `{"ok":false,"error":"missing_scope"}`), notify.FoundUnknown},
		"not ok":                               {"", nil, answer(200, `{"ok":false}`), notify.FoundUnknown},
		"empty":                                {"metadata.message:read", nil, answer(200, `{}`), notify.FoundUnknown},
		"HTML":                                 {"", nil, answer(200, `<html>`), notify.FoundUnknown},
		"more, without a cursor":               {"metadata.message:read", nil, answer(200, `{"ok":true,"messages":[],"has_more":true}`, "X-OAuth-Scopes: metadata.message:read"), notify.FoundUnknown},
		"cut":                                  {"", nil, hangUp, notify.FoundUnknown},
	} {
		t.Run(what, func(t *testing.T) {
			f := newFake(t)
			f.scopes = c.scopes
			ch := channelOf(t, f, Options{})
			post(ch, c.posted...)
			if c.step != nil {
				f.then("conversations.history", c.step)
			}
			if found, _ := ch.Find(ctx, notice); found != c.want {
				t.Errorf("got %v, want %v", found, c.want)
			}
		})
	}
	t.Run("too many pages", func(t *testing.T) {
		f := newFake(t)
		for range 9 {
			f.then("conversations.history", answer(200, `{"ok":true,"messages":[],"response_metadata":{"next_cursor":"x"}}`))
		}
		if found, _ := channelOf(t, f, Options{}).Find(ctx, notice); found != notify.FoundUnknown || f.count("conversations.history") != pagesMost {
			t.Errorf("%v after %d pages", found, f.count("conversations.history"))
		}
	})
}

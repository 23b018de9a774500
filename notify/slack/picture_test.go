package slack

import (
	"context"
	"fmt"
	"strings"
	"testing"
	"time"

	"strayd/notify"
)

var picture = &notify.Picture{Name: "strayd-12.png", PNG: []byte("\x89PNG not quite"), Text: `60 returns of <alder> & "birch"`}

// The calls are those that the service's documentation of uploads names: an address, the file, the completion.
func TestAttach(t *testing.T) {
	f := newFake(t)
	c := channelOf(t, f, Options{})
	n := notice
	n.Receipt = target + "/1700000000.000100"
	if err := c.Attach(context.Background(), n, picture); err != nil {
		t.Fatal(err)
	}
	if got, want := fmt.Sprint(f.uploads), "[strayd-12.png of 14 bytes shown in "+n.Receipt+"]"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
	form := f.calls["files.getUploadURLExternal"][0]
	for name, want := range map[string]string{"filename": "strayd-12.png", "length": "14", "alt_txt": picture.Text} {
		if got := form.Get(name); got != want {
			t.Errorf("%s: %q, want %q", name, got, want)
		}
	}
	if f.count("chat.postMessage") != 0 {
		t.Error("a message was posted")
	}
}

// Each step of an upload may fail in each way: one error of the right class, no step is repeated, the token is in no reason.
func TestAttachFailures(t *testing.T) {
	steps := []string{"files.getUploadURLExternal", "upload", "files.completeUploadExternal"}
	for at, step := range steps {
		for name, c := range map[string]struct {
			do    func(*fake)
			class notify.Class
			after time.Duration
		}{
			"429":     {func(f *fake) { f.then(step, answer(429, "", "Retry-After: 30")) }, notify.Retry, 30 * time.Second},
			"500":     {func(f *fake) { f.then(step, answer(500, "oops "+token)) }, notify.Ambiguous, 0},
			"cut":     {func(f *fake) { f.then(step, hangUp) }, notify.Ambiguous, 0},
			"forward": {func(f *fake) { f.then(step, answer(302, "", "Location: https://example.invalid/")) }, notify.Retry, 0},
		} {
			f := newFake(t)
			c.do(f)
			n := notice
			n.Receipt = target + "/1.2"
			err := channelOf(t, f, Options{Timeout: 5 * time.Second}).Attach(context.Background(), n, picture)
			got := failureOf(err)
			if got == nil || got.Class != c.class || got.After != c.after {
				t.Errorf("%s at %s: %+v, want %s after %v", name, step, got, c.class, c.after)
			}
			if err != nil && strings.Contains(err.Error(), token) {
				t.Errorf("%s at %s: the reason holds the token: %v", name, step, err)
			}
			for k, s := range steps {
				if want := map[bool]int{true: 1}[k <= at]; f.count(s) != want {
					t.Errorf("%s at %s: %d calls of %s, want %d", name, step, f.count(s), s, want)
				}
			}
		}
	}
	for code, want := range map[string]notify.Class{"missing_scope": notify.DeadAll, "is_archived": notify.DeadChannel, "file_upload_size_restricted": notify.Unknown} {
		f := newFake(t)
		f.then("files.completeUploadExternal", answer(200, `{"ok":false,"error":"`+code+`"}`))
		n := notice
		n.Receipt = target + "/1.2"
		if got := failureOf(channelOf(t, f, Options{}).Attach(context.Background(), n, picture)); got == nil || got.Class != want {
			t.Errorf("%s: %+v, want %s", code, got, want)
		}
	}
}

func failureOf(err error) *notify.Failure {
	f, _ := err.(*notify.Failure)
	return f
}

// An address elsewhere gets neither the picture nor the token, and a token without the permission is not tried with.
func TestAttachGoesNowhereElse(t *testing.T) {
	f, other := newFake(t), newFake(t)
	f.then("files.getUploadURLExternal", answer(200, `{"ok":true,"upload_url":"`+other.URL+`/api/upload","file_id":"F1"}`))
	c := channelOf(t, f, Options{})
	n := notice
	n.Receipt = target + "/1.2"
	if err := c.Attach(context.Background(), n, picture); err == nil || strings.Contains(err.Error(), token) {
		t.Errorf("error %v", err)
	}
	if other.count("upload") != 0 {
		t.Error("the picture went elsewhere")
	}
	if err := c.Attach(context.Background(), notice, picture); err == nil {
		t.Error("attached to no message")
	}
	f.scopes = "chat:write"
	if a, err := c.Check(context.Background()); err != nil || !strings.Contains(a.String(), "without the permission files:write no chart") {
		t.Errorf("check says %q, %v", a, err)
	}
	before := f.count("files.getUploadURLExternal")
	if got := failureOf(c.Attach(context.Background(), n, picture)); got == nil || got.Class != notify.DeadAll || f.count("files.getUploadURLExternal") != before {
		t.Errorf("without the permission: %+v", got)
	}
}

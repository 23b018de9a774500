package main

import (
	"context"
	"fmt"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/chromedp"

	"strayd/rules"
)

// browser is a real one without a window.
func browser(t *testing.T) context.Context {
	t.Helper()
	path := ""
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if found, err := exec.LookPath(name); err == nil {
			path = found
			break
		}
	}
	if path == "" {
		t.Skip("no chromium here")
	}
	options := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(path), chromedp.DisableGPU, chromedp.Flag("disable-quic", true),
		chromedp.Flag("disable-component-update", true), chromedp.Flag("host-resolver-rules", "MAP foreign.example 127.0.0.1"))
	if os.Getuid() == 0 {
		options = append(options, chromedp.NoSandbox)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 3*time.Minute)
	t.Cleanup(cancel)
	ctx, end := chromedp.NewExecAllocator(ctx, options...)
	t.Cleanup(end)
	ctx, end = chromedp.NewContext(ctx)
	t.Cleanup(end)
	if err := chromedp.Do(ctx); err != nil {
		t.Fatal(err)
	}
	return ctx
}

// window is one person's browser, which shares nothing with another's.
type window struct {
	t   *testing.T
	ctx context.Context

	mu    sync.Mutex
	sent  []string          // where requests went
	heads []network.Headers // what they said
}

func newWindow(t *testing.T, browser context.Context) *window {
	t.Helper()
	ctx, end := chromedp.NewContext(browser, chromedp.WithNewBrowserContext())
	t.Cleanup(end)
	w := &window{t: t, ctx: ctx}
	if err := chromedp.Listen(ctx, func(event any) {
		w.mu.Lock()
		defer w.mu.Unlock()
		switch e := event.(type) {
		case *network.EventRequestWillBeSent:
			w.sent = append(w.sent, e.Request.URL)
		case *network.EventRequestWillBeSentExtraInfo:
			w.heads = append(w.heads, e.Headers)
		}
	}); err != nil {
		t.Fatal(err)
	}
	w.do(chromedp.EmulateViewport(1280, 900))
	return w
}

func (w *window) do(steps ...chromedp.Action[chromedp.Void]) {
	w.t.Helper()
	if err := chromedp.Do(w.ctx, steps...); err != nil {
		w.t.Fatal(err)
	}
}

func ask[T any](w *window, a chromedp.Action[T]) T {
	w.t.Helper()
	v, err := chromedp.Run(w.ctx, a)
	if err != nil {
		w.t.Fatal(err)
	}
	return v
}

// open goes to an address and wants texts on what it shows.
func (w *window) open(address string, texts ...string) {
	w.t.Helper()
	w.do(chromedp.Navigate(address))
	w.shows(texts...)
}

func (w *window) shows(texts ...string) {
	w.t.Helper()
	page := ask(w, chromedp.Text("body"))
	for _, want := range texts {
		if !strings.Contains(page, want) {
			w.t.Errorf("the page has no %q\n%s", want, page)
		}
	}
}

// press clicks something that leads to another page, and waits for that.
func (w *window) press(selector string, texts ...string) {
	w.t.Helper()
	if _, err := chromedp.RunResponse(w.ctx, chromedp.Click(selector)); err != nil {
		w.t.Fatalf("%s: %v", selector, err)
	}
	w.shows(texts...)
}

// plain is what can be told of a page by a look at its elements: what a screen reader would miss.
const plain = `[
	...[...document.querySelectorAll("input:not([type=hidden]),select,textarea")].filter(e => !e.labels?.length && !e.ariaLabel).map(e => "no label: " + e.outerHTML),
	...[...document.querySelectorAll("svg:not([aria-hidden])")].filter(e => e.getAttribute("role") !== "img" || !e.querySelector("title")).map(e => "no name: svg"),
	...[...document.querySelectorAll("table")].filter(e => !e.querySelector("thead th[scope=col]")).map(e => "no heads: table"),
	...["h1", "main", "footer"].filter(e => document.querySelectorAll(e).length !== 1).map(e => "not one: " + e),
	...[...document.querySelectorAll("[id]")].filter(e => document.querySelectorAll("#" + CSS.escape(e.id)).length > 1).map(e => "id twice: " + e.id),
	...[...document.querySelectorAll("[aria-labelledby]")].flatMap(e => e.getAttribute("aria-labelledby").split(" ")).filter(id => !document.getElementById(id)).map(id => "no id " + id),
	...(document.documentElement.scrollWidth > innerWidth ? ["wider than the screen: " + document.documentElement.scrollWidth] : []),
	...(document.documentElement.lang ? [] : ["no language"]),
]`

// readable wants every page to be so on a wide and on a narrow screen.
func (w *window) readable(root string, paths ...string) {
	w.t.Helper()
	for _, width := range []int64{1280, 390} {
		w.do(chromedp.EmulateViewport(width, 844))
		for _, path := range paths {
			w.do(chromedp.Navigate(root + path))
			for _, fault := range ask(w, chromedp.Evaluate[[]string](plain)) {
				w.t.Errorf("%s at %d: %s", path, width, fault)
			}
			if folder := os.Getenv("STRAYD_SCREENSHOTS"); folder != "" {
				name := fmt.Sprintf("%s-%d.png", url.QueryEscape(path), width)
				if err := os.WriteFile(filepath.Join(folder, name), ask(w, chromedp.FullScreenshot(100)), 0o644); err != nil {
					w.t.Fatal(err)
				}
			}
		}
	}
}

// keptInside wants every request to have gone to the page's own host, and none to say where it came from.
func (w *window) keptInside(host string) {
	w.t.Helper()
	w.mu.Lock()
	defer w.mu.Unlock()
	if len(w.sent) < 20 || len(w.heads) < 20 {
		w.t.Errorf("only %d requests were seen, with %d heads", len(w.sent), len(w.heads))
	}
	for _, address := range w.sent {
		if u, err := url.Parse(address); err != nil || u.Host != host && u.Scheme != "data" {
			w.t.Errorf("a request went to %s", address)
		}
	}
	for _, head := range w.heads {
		for name, value := range head {
			if strings.EqualFold(name, "Referer") {
				w.t.Errorf("a request said where the reader came from: %v", value)
			}
		}
	}
}

func (b *besides) link(who rules.Person) string {
	b.t.Helper()
	b.t.Cleanup(b.d.desk.close)
	_, text := b.as(b.t.Context(), who, "desk")
	link, _, _ := strings.Cut(text, "\n")
	return link
}

// One person opens the link, reads a flag and decides it; from the same person the sign-off is not taken, from a second one it is.
func TestDeskInABrowser(t *testing.T) {
	chromium := browser(t)
	b := flaggedFolder(t, fourEyes).beside()
	var log strings.Builder
	b.d.log = slog.New(slog.NewJSONHandler(&log, nil))
	link := b.link(alice)
	at, err := url.Parse(link)
	if err != nil {
		t.Fatal(err)
	}
	a := newWindow(t, chromium)
	a.open(link, "The desk of alice (uid 1001)")
	if _, err := chromedp.RunResponse(a.ctx, chromedp.KeyEvent("\r")); err != nil { // the button has the focus
		t.Fatal(err)
	}
	a.shows("12 flags ask something", "12 of 12 series", "alice (uid 1001)")
	root := ask(a, chromedp.Location())
	a.press(`a[href="flag?ref=1"]`, "What is behind it", "20 observations", "breach under range \"own\"", "asks for four eyes")
	a.do(chromedp.Click(`input[value=error]`), chromedp.SetValue(`select[name=reason]`, "data error"),
		chromedp.SendKeys(`form[aria-label=Decide] textarea`, "resent <b>today</b>"))
	a.press(`button[value=decide]`, "A second person must agree", "resent <b>today</b>", "from you it will not be taken")
	a.press(`button[value="sign-off"]`, "Not done", "a second person must sign it off")

	o := newWindow(t, chromium)
	o.open(root, "Nobody is known at this desk")
	o.open(link, "not good, or not any more")
	o.open(b.link(bob), "The desk of bob (uid 1002)")
	o.press("button.main", "bob (uid 1002)")
	o.press(`a[href="flag?ref=1"]`, "that may be you")
	o.press(`button[value="sign-off"]`, "Done", "signed off, by bob (uid 1002)")
	b.expect(bob, "explain 1", exitDone, "by bob (uid 1002)")
	b.expect(bob, "ledger verify", exitDone, "is whole")

	a.readable(root, "", "flag?ref=1", "flag?ref=2", "flags?ref=2,3", "series", "series?name=fund-03", "feeds", "weeks")
	a.keptInside(at.Host)
	for _, secret := range []string{at.Query().Get("link"), strings.Split(root, "/")[4]} {
		if strings.Contains(log.String(), secret) {
			t.Errorf("the log gives a secret away:\n%s", log.String())
		}
	}
}

// A page of another site, another name for this machine, and a link that is too old get nothing.
func TestDeskKeepsOthersOut(t *testing.T) {
	chromium := browser(t)
	b := flaggedFolder(t, deskBook).beside()
	now := time.Now()
	b.d.desk.now = func() time.Time { return now }
	w := newWindow(t, chromium)
	link := b.link(alice)
	w.open(strings.Replace(link, "127.0.0.1", "foreign.example", 1), "not served under that name")
	w.open(link, "The desk of alice")
	w.press("button.main", "12 flags")
	root := ask(w, chromedp.Location())
	form := ask(w, chromedp.AttributeValue(`input[name=form]`, "value")).Value
	evil := httptest.NewServer(http.HandlerFunc(func(rw http.ResponseWriter, _ *http.Request) {
		rw.Header().Set("Content-Type", "text/html")
		fmt.Fprintf(rw, `<form action="%sact" method="post"><input name="form" value="%s"><input name="ref" value="1"><button name="deed" value="acknowledge">win</button></form>`,
			root, form)
	}))
	t.Cleanup(evil.Close)
	for _, name := range []string{"127.0.0.1", "foreign.example"} { // another port of the same site, and another site, with all that the form needs
		w.open(strings.Replace(evil.URL, "127.0.0.1", name, 1), "win")
		w.press("button", "from a page of another site")
	}
	b.expect(alice, "flags --standing acknowledged", exitDone, "No flag fits")
	w.open(root, "12 flags")

	late := b.link(bob)
	now = now.Add(3 * time.Minute)
	w.open(late, "not good, or not any more")
	now = now.Add(11 * time.Hour)
	w.open(root, "Nobody is known at this desk")
}

// Dark and light differ, and so does paper.
func TestDeskGoesWithTheLight(t *testing.T) {
	chromium := browser(t)
	b := flaggedFolder(t, deskBook).beside()
	w := newWindow(t, chromium)
	w.open(b.link(alice), "The desk of alice")
	w.press("button.main", "12 flags")
	ground := map[string]bool{}
	for _, scheme := range []string{"light", "dark"} {
		if _, err := chromedp.Call(w.ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Features: []*emulation.MediaFeature{
			{Name: "prefers-color-scheme", Value: scheme}}}); err != nil {
			t.Fatal(err)
		}
		ground[ask(w, chromedp.Evaluate[string](`getComputedStyle(document.body).backgroundColor`))] = true
	}
	if len(ground) != 2 {
		t.Errorf("the grounds are %v", ground)
	}
	if _, err := chromedp.Call(w.ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Media: "print"}); err != nil {
		t.Fatal(err)
	}
	if seen := ask(w, chromedp.Evaluate[string](`getComputedStyle(document.querySelector("nav")).display`)); seen != "none" {
		t.Errorf("the menu is printed: %s", seen)
	}
}

package page

import (
	"context"
	"fmt"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"net/url"
	"regexp"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// stand is a page over a ledger with one open flag, at a time that the test moves.
type stand struct {
	*Page
	t    testing.TB
	now  time.Time
	log  strings.Builder
	done [][]string // command lines, behind who gave them
	fail bool       // commands are refused
}

var ada = rules.Person{UID: 1001, Name: "ada"}

const hostile = "</td><script>alert(1)</script>\u202e&\""

func newStand(t testing.TB) *stand {
	t.Helper()
	s := &stand{t: t, now: time.Date(2026, 3, 12, 20, 0, 0, 0, time.UTC)}
	flag := rules.Flag{Ref: 7, Date: 20524, RaisedAt: s.now, Series: hostile, Group: "bond", Kind: rules.KindBreach, Return: rules.One / 10, Low: rules.Some(-0.01),
		High: rules.Some(0.01), Standing: rules.Open, Note: hostile}
	var err error
	s.Page, err = New(Sources{
		Now:  func() time.Time { return s.now },
		View: func() (watcher.View, error) { return oneFlag{flag: flag}, nil },
		Book: func() Book {
			return Book{Zone: time.UTC, Weeks: fstest.MapFS{"2026-W11.html": {Data: []byte("a log")}, "secret.txt": {}}}
		},
		Explain: func(watcher.View, uint64, bool) (*Evidence, error) { return nil, nil },
		Do: func(_ context.Context, who rules.Person, args []string) (bool, string) {
			s.done = append(s.done, append([]string{who.String()}, args...))
			return !s.fail, "what came of it\n"
		},
		Host: func(host string) bool { return host == "127.0.0.1:9" || host == "desk.example.org" },
		Proxied: func(r Asked) (rules.Person, bool) {
			return ada, r.Host == "desk.example.org" && r.Header("Sec-Fetch-Site") == "same-origin"
		},
		Log: slog.New(slog.NewTextHandler(&s.log, nil)),
	})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// oneFlag is a reading with one open flag and nothing else.
type oneFlag struct {
	watcher.View
	flag rules.Flag
}

func (oneFlag) Close() error                                  { return nil }
func (oneFlag) Step() uint32                                  { return 1 }
func (oneFlag) Head() (string, error)                         { return "", nil }
func (oneFlag) Files(func(watcher.FileRow) bool) error        { return nil }
func (o oneFlag) Flag(uint64) (rules.Flag, bool, error)       { return o.flag, true, nil }
func (o oneFlag) Flags(_ bool, f func(rules.Flag) bool) error { f(o.flag); return nil }

// asked is one request; what is left empty is as a browser at the desk would send it.
type asked struct {
	method, path, host, origin, site, cookie, form, kind string
}

func (s *stand) ask(a asked) *http.Response {
	s.t.Helper()
	if a.method == "" {
		a.method = "GET"
	}
	r := httptest.NewRequest(a.method, "http://127.0.0.1:9"+a.path, strings.NewReader(a.form))
	if a.host != "" {
		r.Host = a.host
	}
	for name, value := range map[string]string{"Origin": a.origin, "Sec-Fetch-Site": a.site, "Content-Type": a.kind} {
		if value != "" {
			r.Header.Set(name, value)
		}
	}
	if a.cookie != "" {
		r.AddCookie(&http.Cookie{Name: cookieName, Value: a.cookie})
	}
	w := httptest.NewRecorder()
	s.Handler().ServeHTTP(w, r)
	return w.Result()
}

func (s *stand) want(a asked, status int, text string) *http.Response {
	s.t.Helper()
	res := s.ask(a)
	body, _ := io.ReadAll(res.Body)
	if res.StatusCode != status || !strings.Contains(string(body), text) {
		s.t.Errorf("%+v: status %d, want %d and %q\n%s", a, res.StatusCode, status, text, body)
	}
	res.Body = io.NopCloser(strings.NewReader(string(body)))
	return res
}

const form = "application/x-www-form-urlencoded"

// enter takes up a new link and gives the desk's path, cookie and form token.
func (s *stand) enter(who rules.Person) (path, cookie, token string) {
	s.t.Helper()
	_, link, _ := strings.Cut(s.Invite(who), "link=")
	res := s.want(asked{method: "POST", path: "/enter", form: "link=" + link, kind: form, origin: "http://127.0.0.1:9"}, http.StatusSeeOther, "")
	c := res.Cookies()[0]
	if !c.HttpOnly || c.SameSite != http.SameSiteStrictMode || c.Path != res.Header.Get("Location") || strings.Contains(s.log.String(), link) {
		s.t.Errorf("the cookie is %v, the log says %s", c, s.log.String())
	}
	page := s.want(asked{path: c.Path, cookie: c.Value}, http.StatusOK, "ada (uid 1001)")
	body, _ := io.ReadAll(page.Body)
	return strings.TrimSuffix(c.Path, "/"), c.Value, regexp.MustCompile(`name="form" value="([^"]+)"`).FindStringSubmatch(string(body))[1]
}

func TestLinkIsForOneUseWithinItsTime(t *testing.T) {
	s := newStand(t)
	link := s.Invite(ada)
	_, token, _ := strings.Cut(link, "link=")
	post := asked{method: "POST", path: "/enter", form: "link=" + token, kind: form}
	s.want(asked{path: link}, http.StatusOK, "The desk of ada (uid 1001)")
	s.want(asked{path: link}, http.StatusOK, "Enter as ada") // looking takes nothing up
	s.want(post, http.StatusSeeOther, "")
	s.want(post, http.StatusForbidden, "not good, or not any more")
	s.want(asked{path: link}, http.StatusForbidden, "not good, or not any more")

	late := s.Invite(ada)
	s.now = s.now.Add(linkTime)
	s.want(asked{path: late}, http.StatusForbidden, "not good")
	_, token, _ = strings.Cut(late, "link=")
	post.form = "link=" + token
	s.want(post, http.StatusForbidden, "not good")
	s.want(asked{path: "/enter?link="}, http.StatusForbidden, "not good")
	s.want(asked{path: "/enter"}, http.StatusForbidden, "not good")
}

func TestWhoeverIsNotAtTheDeskIsRefused(t *testing.T) {
	s := newStand(t)
	path, cookie, token := s.enter(ada)
	act := "form=" + token + "&ref=7&deed=acknowledge"
	for name, a := range map[string]asked{
		"no cookie":           {path: path + "/"},
		"another cookie":      {path: path + "/", cookie: "x" + cookie},
		"another desk's path": {path: "/desk/x/", cookie: cookie},
		"no path":             {path: "/", cookie: cookie},
		"a longer path":       {path: path + "x/", cookie: cookie},
		"a deed, no cookie":   {method: "POST", path: path + "/act", form: act, kind: form},
	} {
		if res := s.ask(a); res.StatusCode != http.StatusUnauthorized {
			t.Errorf("%s: status %d", name, res.StatusCode)
		}
	}
	for name, a := range map[string]struct {
		asked
		status int
	}{
		"foreign host":            {asked{path: path + "/", cookie: cookie, host: "evil.example"}, http.StatusMisdirectedRequest},
		"foreign host, link":      {asked{path: s.Invite(ada), host: "evil.example:9"}, http.StatusMisdirectedRequest},
		"foreign origin":          {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: form, origin: "http://evil.example"}, http.StatusForbidden},
		"foreign origin, reading": {asked{path: path + "/", cookie: cookie, origin: "http://evil.example"}, http.StatusForbidden},
		"another port":            {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: form, origin: "http://127.0.0.1:8"}, http.StatusForbidden},
		"another site":            {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: form, site: "cross-site"}, http.StatusForbidden},
		"another port, by site":   {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: form, site: "same-site"}, http.StatusForbidden},
		"origin null":             {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: form, origin: "null"}, http.StatusForbidden},
		"no token":                {asked{method: "POST", path: path + "/act", cookie: cookie, form: "ref=7&deed=acknowledge", kind: form}, http.StatusForbidden},
		"wrong token":             {asked{method: "POST", path: path + "/act", cookie: cookie, form: "form=x&ref=7&deed=acknowledge", kind: form}, http.StatusForbidden},
		"no form":                 {asked{method: "POST", path: path + "/act", cookie: cookie, form: act, kind: "text/plain"}, http.StatusUnsupportedMediaType},
		"a deed by GET":           {asked{path: path + "/act?" + act, cookie: cookie}, http.StatusNotFound},
		"no such page":            {asked{path: path + "/nothing", cookie: cookie}, http.StatusNotFound},
		"too long":                {asked{method: "POST", path: path + "/act", cookie: cookie, form: act + "&note=" + strings.Repeat("x", largestForm), kind: form}, http.StatusBadRequest},
	} {
		if res := s.ask(a.asked); res.StatusCode != a.status {
			t.Errorf("%s: status %d, want %d", name, res.StatusCode, a.status)
		}
	}
	if len(s.done) > 0 {
		t.Errorf("commands were carried out: %q", s.done)
	}
	s.now = s.now.Add(deskTime)
	s.want(asked{path: path + "/", cookie: cookie}, http.StatusUnauthorized, "strayd desk")
}

// What a form says becomes the command line that says the same, whatever people type.
func TestDeedsAreCommandLines(t *testing.T) {
	s := newStand(t)
	path, cookie, token := s.enter(ada)
	for _, c := range []struct{ form, want string }{
		{"deed=acknowledge&ref=7", "acknowledge 7"},
		{"deed=acknowledge&ref=9,7&ref=8&note=a%0Ab", "acknowledge 7 8 9 --note=a b"},
		{"deed=decide&ref=7&conclusion=genuine&value=&reason=market+move&note=n&override=o", "decide 7 genuine --override=o --reason=market move --note=n"},
		{"deed=decide&ref=7&conclusion=corrected&value=-1.2%25&reason=data+error&note=--until", "decide 7 corrected=-1.2% --reason=data error --note=--until"},
		{"deed=decide&ref=7", "decide 7"},
		{"deed=waive&ref=7&until=2026-03-20&reason=data+error", "waive 7 --until=2026-03-20"},
		{"deed=sign-off&ref=7&note=-x", "sign-off 7 --note=-x"},
	} {
		s.done = nil
		s.want(asked{method: "POST", path: path + "/act", cookie: cookie, form: "form=" + token + "&" + c.form, kind: form}, http.StatusSeeOther, "")
		if got := strings.Join(s.done[0], " "); got != "ada (uid 1001) "+c.want {
			t.Errorf("%s: %q, want %q", c.form, got, c.want)
		}
	}
	s.done = nil
	many := ""
	for n := range mostRefs + 1 {
		many += fmt.Sprintf("%d,", n)
	}
	for _, bad := range []string{"deed=acknowledge", "deed=acknowledge&ref=--note", "deed=weekly&ref=7", "ref=7", "deed=decide&ref=7&conclusion=--now",
		"deed=decide&ref=7&conclusion=genuine&reason=x", "deed=accept&ref=7&note=x", "deed=acknowledge&ref=" + many} {
		if res := s.ask(asked{method: "POST", path: path + "/act", cookie: cookie, form: "form=" + token + "&" + bad, kind: form}); res.StatusCode != http.StatusBadRequest {
			t.Errorf("%s: status %d", bad, res.StatusCode)
		}
	}
	if s.fail = true; len(s.done) > 0 {
		t.Errorf("commands were carried out: %q", s.done)
	}
	res := s.want(asked{method: "POST", path: path + "/act", cookie: cookie, form: "form=" + token + "&deed=acknowledge&ref=7,8", kind: form}, http.StatusUnprocessableEntity, "what came of it")
	if h := res.Header; h.Get("Cache-Control") != "no-store" || !strings.Contains(h.Get("Content-Security-Policy"), "default-src 'none'") ||
		h.Get("Referrer-Policy") != "no-referrer" {
		t.Errorf("headers %v", h)
	}
}

// Names come from other people's files.
func TestHostileNamesAreText(t *testing.T) {
	s := newStand(t)
	path, cookie, _ := s.enter(ada)
	res := s.want(asked{path: path + "/", cookie: cookie}, http.StatusOK, "&lt;script&gt;")
	body, _ := io.ReadAll(res.Body)
	if text := string(body); strings.Contains(text, "<script") || strings.Contains(text, "\u202e") || !strings.Contains(text, "%e2%80%ae") {
		t.Errorf("%s", text)
	}
}

func TestWeeklyLogsAlone(t *testing.T) {
	s := newStand(t)
	path, cookie, _ := s.enter(ada)
	s.want(asked{path: path + "/weeks", cookie: cookie}, http.StatusOK, "2026-W11")
	s.want(asked{path: path + "/week?file=2026-W11.html", cookie: cookie}, http.StatusOK, "a log")
	for _, name := range []string{"secret.txt", "../secret.txt", "2026-W12.html", "", "2026-W11.html/", "2026-W11.ledger"} {
		s.want(asked{path: path + "/week?file=" + url.QueryEscape(name), cookie: cookie}, http.StatusNotFound, "no weekly log")
	}
}

// Behind a proxy that says who asks there is no link and no cookie; forms carry a token all the same.
func TestProxyNamesWhoAsks(t *testing.T) {
	s := newStand(t)
	proxied := asked{path: "/", host: "desk.example.org", site: "same-origin"}
	res := s.want(proxied, http.StatusOK, "ada (uid 1001)")
	body, _ := io.ReadAll(res.Body)
	token := regexp.MustCompile(`name="form" value="([^"]+)"`).FindStringSubmatch(string(body))[1]
	proxied.method, proxied.path, proxied.kind = "POST", "/act", form
	proxied.form = "deed=acknowledge&ref=7"
	s.want(proxied, http.StatusForbidden, "made for another desk")
	proxied.form += "&form=" + token
	if res := s.want(proxied, http.StatusSeeOther, ""); res.Header.Get("Location") != "/flag?ref=7" || len(s.done) != 1 {
		t.Errorf("%v, %q", res.Header, s.done)
	}
	s.want(asked{path: "/", host: "desk.example.org"}, http.StatusUnauthorized, "Nobody is known")
	s.want(asked{path: "/", host: "127.0.0.1:9", site: "same-origin"}, http.StatusUnauthorized, "Nobody is known")
}

func TestLeaving(t *testing.T) {
	s := newStand(t)
	path, cookie, token := s.enter(ada)
	s.want(asked{method: "POST", path: path + "/leave", cookie: cookie, form: "form=x", kind: form}, http.StatusForbidden, "")
	s.want(asked{method: "POST", path: path + "/leave", cookie: cookie, form: "form=" + token, kind: form}, http.StatusOK, "You have left")
	s.want(asked{path: path + "/", cookie: cookie}, http.StatusUnauthorized, "")
}

// Links and desks that nobody uses do not pile up, and the oldest goes first.
func TestDoorsAreBounded(t *testing.T) {
	now := time.Unix(0, 0)
	d := newDoor(func() time.Time { return now })
	first := d.invite(ada)
	for range mostLinks {
		now = now.Add(time.Millisecond)
		d.invite(ada)
	}
	if _, ok := d.whose(first); ok || len(d.links) != mostLinks {
		t.Errorf("%d links are kept, the first is good: %v", len(d.links), ok)
	}
}

// Every page names no address but its own.
func TestPagesAskForNothingOutside(t *testing.T) {
	names, _ := files.ReadDir(".")
	for _, e := range names {
		text, err := files.ReadFile(e.Name())
		if err != nil {
			t.Fatal(err)
		}
		if found := regexp.MustCompile(`(?i)https?:|<script|style="|\son[a-z]+=|@import|url\(`).Find(text); found != nil {
			t.Errorf("%s: %s", e.Name(), found)
		}
	}
}

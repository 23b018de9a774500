package main

import (
	"io"
	"net/http"
	"net/http/cookiejar"
	"net/url"
	"os"
	"os/user"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"strayd/rules"
)

// atDesk is somebody at the page of a daemon.
type atDesk struct {
	b    *besides
	http *http.Client
	root string // the desk's address, which ends in a slash
	form string
}

// desk has somebody ask for a link and take it up.
func (b *besides) desk(who rules.Person) *atDesk {
	b.t.Helper()
	b.t.Cleanup(b.d.desk.close)
	code, text := b.as(b.t.Context(), who, "desk")
	link, _, _ := strings.Cut(text, "\n")
	if code != exitDone || !strings.Contains(text, "for "+who.String()+", good for") {
		b.t.Fatalf("desk as %s: exit %d\n%s", who, code, text)
	}
	jar, err := cookiejar.New(nil)
	if err != nil {
		b.t.Fatal(err)
	}
	at, err := url.Parse(link)
	if err != nil {
		b.t.Fatal(err)
	}
	v := &atDesk{b: b, http: &http.Client{Jar: jar}}
	res, err := v.http.PostForm("http://"+at.Host+at.Path, url.Values{"link": {at.Query().Get("link")}})
	if err != nil {
		b.t.Fatal(err)
	}
	v.root = res.Request.URL.String()
	v.form = regexp.MustCompile(`name="form" value="([^"]+)"`).FindStringSubmatch(v.body(res, http.StatusOK))[1]
	return v
}

func (v *atDesk) body(res *http.Response, status int) string {
	v.b.t.Helper()
	defer res.Body.Close()
	text, err := io.ReadAll(res.Body)
	if err != nil || res.StatusCode != status {
		v.b.t.Errorf("%s: %s, %v, want status %d\n%s", res.Request.URL, res.Status, err, status, text)
	}
	return string(text)
}

// sees wants texts on a page, and gives the page.
func (v *atDesk) sees(path string, texts ...string) string {
	v.b.t.Helper()
	res, err := v.http.Get(v.root + path)
	if err != nil {
		v.b.t.Fatal(err)
	}
	return v.has(v.body(res, http.StatusOK), path, texts)
}

func (v *atDesk) has(text, path string, texts []string) string {
	v.b.t.Helper()
	for _, want := range texts {
		if !strings.Contains(text, want) {
			v.b.t.Errorf("%s has no %q\n%s", path, want, text)
		}
	}
	return text
}

// does sends a form and wants texts on the page that follows.
func (v *atDesk) does(form string, status int, texts ...string) {
	v.b.t.Helper()
	values, err := url.ParseQuery(form)
	if err != nil {
		v.b.t.Fatal(err)
	}
	values.Set("form", v.form)
	res, err := v.http.PostForm(v.root+"act", values)
	if err != nil {
		v.b.t.Fatal(err)
	}
	v.has(v.body(res, status), form, texts)
}

// Two people at the page do what they could do by command, each under the name that the socket gave.
func TestDeskPage(t *testing.T) {
	b := flaggedFolder(t, fourEyes).beside()
	a, o := b.desk(alice), b.desk(bob)
	a.sees("", "<b>12 flags</b> ask something", "12 of 12</b> series checked", "four eyes", `href="flag?ref=1"`)
	a.sees("flag?ref=1", "What is behind it", "breach under range", "<dt>made of</dt><dd>20 observations", "Its neighbours that day", "portfolio event")
	a.does("ref=1&deed=decide&conclusion=error&reason=data error&note=", http.StatusUnprocessableEntity, "a decision needs a reason and a note", "Not done")
	a.does("ref=1&deed=decide&conclusion=corrected&value=1,5&reason=data error&note=x", http.StatusUnprocessableEntity, "1,5", "Not done")
	a.does("ref=1&deed=decide&conclusion=error&reason=data error&note=resent", http.StatusOK, "A second person must agree", "Done")
	a.does("ref=1&deed=sign-off", http.StatusUnprocessableEntity, "a second person must sign it off")
	a.sees("flag?ref=1", "from you it will not be taken", "<q>resent</q>")
	o.sees("flag?ref=1", "that may be you")
	o.does("ref=1&deed=sign-off&note=agreed", http.StatusOK, "signed off (agreed), by bob (uid 1002)")
	a.does("ref=2,3&deed=acknowledge", http.StatusOK, "Flag 2", "Flag 3", "by alice (uid 1001)")
	b.expect(alice, "waive 1 --until 2999-01-01", exitFailed, "signed off")
	a.does("ref=4&deed=waive&until=2999-01-01", http.StatusOK, "waived")
	a.does("ref=5&deed=decide&conclusion=genuine&reason=market move&note=x", http.StatusUnprocessableEntity, "no market move", `value="genuine" required checked`)
	a.does("ref=5&deed=decide&conclusion=genuine&reason=market move&note=x&override=index fell", http.StatusOK, "overridden: index fell")
	b.expect(alice, "explain 1", exitDone, "by bob (uid 1002) (agreed)")
	b.expect(alice, "ledger verify", exitDone, "is whole")
	o.sees("series?name=fund-01", "What would be in range next", "Its dates", `href="flag?ref=2"`)
	o.sees("series", "12 series", "fund-11")
	o.sees("feeds", "a.csv", "Week by week")
	o.sees("weeks", "None is archived yet")
	b.expect(alice, "weekly --archive", exitDone, "weekly")
	o.sees("weeks", "week?file=")
}

// A refused file is released at the page, as by the command accept.
func TestDeskReleasesAFile(t *testing.T) {
	f := demoFolder(t)
	f.nextDay("returns-2026-03-16.csv", 100)
	b := f.beside()
	b.expect(alice, "pass --settled", exitFailed, "refused")
	a := b.desk(alice)
	ref := regexp.MustCompile(`flag\?ref=(\d+)"[^>]*>[^<]*</a></td>\s*<th[^>]*><bdi>administrator: returns-2026-03-16.csv`).FindStringSubmatch(a.sees(""))
	if ref == nil {
		t.Fatal("no line for the refused file")
	}
	a.sees("flag?ref="+ref[1], "Release the file", "was refused")
	a.does("ref="+ref[1]+"&deed=accept", http.StatusUnprocessableEntity, "needs --note")
	a.does("ref="+ref[1]+"&deed=accept&note=the desk confirms", http.StatusOK, "released", "by alice")
}

// Of many missing series the page names five, and says how many more there are.
func TestDeskCountsTheMissing(t *testing.T) {
	f := demoFolder(t)
	f.nextDay("whole.csv", 1)
	text, err := os.ReadFile(filepath.Join(f.path, "inbox/whole.csv"))
	if err != nil {
		t.Fatal(err)
	}
	var kept []string
	for n, line := range strings.Split(strings.TrimSpace(string(text)), "\n") {
		if n == 0 || n%3 != 0 { // 24 series without every third
			kept = append(kept, line)
		}
	}
	if err := os.Remove(filepath.Join(f.path, "inbox/whole.csv")); err != nil {
		t.Fatal(err)
	}
	f.write("inbox/returns-2026-03-16.csv", strings.Join(kept, "\n")+"\n")
	b := f.beside()
	b.expect(alice, "pass --settled", exitDone, "16 new")
	page := b.desk(alice).sees("", "16 of 24</b> series checked", "and 3 more")
	if n := strings.Count(page[strings.Index(page, "no value"):strings.Index(page, "and 3 more")], "<bdi>"); n != 5 {
		t.Errorf("%d missing series are named, want 5", n)
	}
}

// Whoever has no link gets nothing, and no daemon gives none.
func TestDeskWithoutDaemon(t *testing.T) {
	f := flaggedFolder(t, deskBook)
	if code, _, errs := f.try("desk"); code != exitFailed || !strings.Contains(errs, "begin with `strayd run`") {
		t.Errorf("exit %d\n%s", code, errs)
	}
}

// A proxy is believed under its own host and with its secret alone, and only of users whom the system has.
func TestDeskBehindAProxy(t *testing.T) {
	me, err := user.Current()
	if err != nil {
		t.Fatal(err)
	}
	const secret = "0123456789abcdef"
	keys := fourEyes + "page: {listen: \"127.0.0.1:9\", host: desk.example.org, identity: X-Remote-User}\n"
	f := flaggedFolder(t, keys)
	t.Setenv("STRAYD_PAGE_SECRET", secret)
	b := f.beside()
	b.t.Cleanup(b.d.desk.close)
	if err := b.d.openPage(anyPort); err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]struct {
		host, secret, user string
		status             int
	}{
		"the proxy":        {"desk.example.org", secret, me.Username, http.StatusOK},
		"with a port":      {"Desk.Example.org:443", secret, me.Username, http.StatusOK},
		"no secret":        {"desk.example.org", "", me.Username, http.StatusUnauthorized},
		"another secret":   {"desk.example.org", "0123456789abcdee", me.Username, http.StatusUnauthorized},
		"by this machine":  {"127.0.0.1", secret, me.Username, http.StatusUnauthorized},
		"no such user":     {"desk.example.org", secret, "nobody-of-that-name", http.StatusUnauthorized},
		"no user":          {"desk.example.org", secret, "", http.StatusUnauthorized},
		"another's host":   {"other.example.org", secret, me.Username, http.StatusMisdirectedRequest},
		"a name as a path": {"desk.example.org", secret, "../" + me.Username, http.StatusUnauthorized},
	} {
		r, err := http.NewRequest("GET", "http://"+b.d.desk.at.String()+"/", nil)
		if err != nil {
			t.Fatal(err)
		}
		r.Host = c.host
		r.Header.Set("X-Remote-User", c.user)
		r.Header.Set(proxyHeader, c.secret)
		res, err := http.DefaultClient.Do(r)
		if err != nil {
			t.Fatal(err)
		}
		text, _ := io.ReadAll(res.Body)
		res.Body.Close()
		if res.StatusCode != c.status || c.status == http.StatusOK && !strings.Contains(string(text), me.Username+" (uid "+me.Uid+")") {
			t.Errorf("%s: %s", name, res.Status)
		}
	}
	for _, bad := range []string{"", "short"} {
		t.Setenv("STRAYD_PAGE_SECRET", bad)
		if _, err := b.d.prepare(b.d.setup.config); err == nil || !strings.Contains(err.Error(), "page.identity") {
			t.Errorf("secret %q: %v", bad, err)
		}
	}
}

package mail

import (
	"context"
	"encoding/base64"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"mime"
	"mime/multipart"
	"mime/quotedprintable"
	"net"
	netmail "net/mail"
	"strings"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

var notice = rules.Notice{Number: 12, Key: "0f1e2d3c4b5a69788796a5b4c3d2e1f0", Channel: "ops", Kind: rules.KindBreach, Refs: []uint64{7},
	Date: rules.NoDate, Made: time.Date(2026, 3, 13, 17, 5, 0, 0, time.UTC), Lines: []string{"BREACH alder returned -4.12 %, ref 7", "Expected -1.93 % to +2.04 %"}}

const receipt = "<0f1e2d3c4b5a69788796a5b4c3d2e1f0@example.org>"

// mailerOf is a mailer that reaches the fake as in earnest; change alters its account.
func mailerOf(t *testing.T, f *fake, o Options, change ...func(*Account)) *Mailer {
	t.Helper()
	a := Account{Server: f.Addr().String(), Security: StartTLS, From: "strayd <strayd@example.org>", To: []string{"desk@example.org", "Ops <ops@example.org>"}}
	if f.implicit {
		a.Security = Implicit
	}
	for _, c := range change {
		c(&a)
	}
	if o.TLS == nil {
		o.TLS = f.trusts()
	}
	if o.Timeout == 0 {
		o.Timeout = 5 * time.Second
	}
	m, err := New(a, notify.NewSecret(user), notify.NewSecret(password), o)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func class(err error) notify.Class {
	var f *notify.Failure
	switch {
	case err == nil:
		return ""
	case !errors.As(err, &f):
		return "no failure"
	}
	return f.Class
}

// read takes a message apart with the standard library, which wrote none of it.
func read(t *testing.T, text string) (envelope string, m *netmail.Message, body string) {
	t.Helper()
	envelope, rest, _ := strings.Cut(text, "\n\n")
	m, err := netmail.ReadMessage(strings.NewReader(rest))
	if err != nil {
		t.Fatalf("%v\n%s", err, rest)
	}
	var in io.Reader = m.Body
	if m.Header.Get("Content-Transfer-Encoding") == "quoted-printable" {
		in = quotedprintable.NewReader(m.Body)
	}
	bytes, err := io.ReadAll(in)
	if err != nil {
		t.Fatal(err)
	}
	return envelope, m, string(bytes)
}

func TestWhatIsSent(t *testing.T) {
	for _, implicit := range []bool{false, true} {
		f := newFake(t, func(f *fake) { f.implicit = implicit })
		at := time.Date(2026, 3, 13, 18, 6, 0, 0, time.UTC)
		got, err := mailerOf(t, f, Options{Now: func() time.Time { return at }}).Post(t.Context(), notice)
		if got != receipt || err != nil {
			t.Fatalf("implicit %v: %q, %v", implicit, got, err)
		}
		if len(f.taken()) != 1 || len(f.inPlain) > 0 {
			t.Fatalf("implicit %v: %d mails, in plain text %q", implicit, len(f.mails), f.inPlain)
		}
		envelope, m, body := read(t, f.mails[0])
		if envelope != "MAIL FROM:<strayd@example.org> BODY=8BITMIME\nRCPT TO:<desk@example.org>\nRCPT TO:<ops@example.org>" {
			t.Errorf("envelope %s", envelope)
		}
		for name, want := range map[string]string{"Subject": notice.Lines[0], "Message-ID": receipt, "Auto-Submitted": "auto-generated",
			"From": `"strayd" <strayd@example.org>`, "To": `<desk@example.org>, "Ops" <ops@example.org>`, "Date": "Fri, 13 Mar 2026 18:06:00 +0000",
			"In-Reply-To": "", "X-Mailer": "", "User-Agent": "", "Content-Type": "text/plain; charset=UTF-8"} {
			if got := m.Header.Get(name); got != want {
				t.Errorf("%s: %q, want %q", name, got, want)
			}
		}
		if body != strings.Join(notice.Lines, "\r\n")+"\r\n" {
			t.Errorf("body %q", body)
		}
	}
}

// A message that follows another names it; one that a person sends again is another message.
func TestThreadsAndRepeats(t *testing.T) {
	f := newFake(t, nil)
	m := mailerOf(t, f, Options{})
	n := notice
	n.Under, n.Ended = "<first@example.org>", time.Unix(99, 0)
	got, err := m.Post(t.Context(), n)
	if err != nil || got != "<0f1e2d3c4b5a69788796a5b4c3d2e1f0-99@example.org>" {
		t.Fatal(got, err)
	}
	_, msg, _ := read(t, f.taken()[0])
	if msg.Header.Get("In-Reply-To") != n.Under || msg.Header.Get("References") != n.Under {
		t.Errorf("headers %v", msg.Header)
	}
	n.Under = "C0123456789/1773421500.000100" // a receipt of the chat that this channel stands in for
	if _, err := m.Post(t.Context(), n); err != nil {
		t.Fatal(err)
	}
	if _, msg, _ = read(t, f.taken()[1]); msg.Header.Get("In-Reply-To") != "" {
		t.Errorf("headers %v", msg.Header)
	}
}

// Names from other people's files end no header, begin no command and close no message.
func TestHostileNames(t *testing.T) {
	f := newFake(t, func(f *fake) { f.noAuth = false })
	m := mailerOf(t, f, Options{})
	for _, name := range []string{"x\r\nBcc: all@example.org\r\n\r\nhello", "x\nQUIT", "\u05d0\u05dc\u05d5\u05df-5", strings.Repeat("ivy-\u00e9\U0001f333-", 40),
		"=?utf-8?q?Bcc?=", "<!channel> & 'x'", "", "\x00\x1b[31m", "\xff\xfe"} {
		n := notice
		n.Lines = []string{"BREACH " + name + " returned", ".", "..", "From x", name, "end"}
		before := len(f.taken())
		if _, err := m.Post(t.Context(), n); err != nil {
			t.Errorf("%q: %v", name, err)
			continue
		}
		mails := f.taken()
		if len(mails) != before+1 {
			t.Fatalf("%q: %d mails more", name, len(mails)-before)
		}
		envelope, msg, body := read(t, mails[before])
		subject, err := new(mime.WordDecoder).DecodeHeader(msg.Header.Get("Subject"))
		if err != nil || !strings.HasPrefix(subject, "BREACH") || !strings.HasSuffix(subject, " returned") || strings.ContainsAny(subject, "\r\n\x00\x1b") {
			t.Errorf("%q: subject %q, %v", name, subject, err)
		}
		if msg.Header.Get("Bcc") != "" || strings.Contains(envelope, "all@") || !strings.Contains(body, "\n.\r\n..\r\nFrom x\r\n") || !strings.HasSuffix(body, "end\r\n") {
			t.Errorf("%q: became\n%s\n%q", name, mails[before], body)
		}
	}
}

// What the codes of each step mean, by RFC 5321, 4.2.1 and 4.3.2, and RFC 4954, 6.
func TestClasses(t *testing.T) {
	for _, c := range []struct {
		step, reply string
		want        notify.Class
		reason      string
	}{
		// before the message: nothing was sent
		{"greet", "421 4.3.2 too busy", notify.Retry, "not ready: 421 4.3.2 too busy"},
		{"greet", "554 5.7.1 not from here", notify.DeadAll, "refuses: 554 5.7.1 not from here"},
		{"greet", "cut", notify.Retry, "not reached"},
		{"greet", "HTTP/1.1 400 Bad Request", notify.Retry, "not reached"},
		{"STARTTLS", "454 not now", notify.Retry, "not ready: 454"},
		{"AUTH", "454 4.7.0 later", notify.Retry, "454"},
		{"AUTH", "535 5.7.8 no", notify.DeadAll, "the user or the password is wrong"},
		{"AUTH", "534 5.7.9 no", notify.DeadAll, "another way to sign in"},
		{"AUTH", "538 no", notify.DeadAll, "encryption"},
		{"AUTH", "cut", notify.Retry, "not reached"},
		// the envelope
		{"MAIL", "451 4.3.0 local error", notify.Retry, "451"},
		{"MAIL", "421 closing", notify.Retry, "421"},
		{"MAIL", "530 5.7.0 sign in first", notify.DeadAll, "530"},
		{"MAIL", "550 5.7.1 sender refused", notify.DeadChannel, "550"},
		{"MAIL", "552 5.3.4 too large", notify.BadPayload, "552"},
		{"MAIL", "cut", notify.Retry, ""},
		{"RCPT", "450 4.2.1 greylisted", notify.Retry, "450"},
		{"RCPT", "550 5.1.1 no such user", notify.DeadChannel, `550 "5.1.1 no such user", affected recipient(s): <desk@example.org>; nobody was sent it`},
		{"RCPT", "553 5.1.3 bad address", notify.DeadChannel, "553"},
		// the message
		{"DATA", "451 4.3.0 no room", notify.Retry, "451"},
		{"DATA", "554 5.5.1 no valid recipients", notify.DeadChannel, "554"},
		{"DATA", "cut", notify.Retry, ""},
		{"END", "451 4.7.1 later", notify.Retry, "451"},
		{"END", "452 4.3.1 disk full", notify.Retry, "452"},
		{"END", "550 5.7.1 looks like spam", notify.BadPayload, "looks like spam"},
		{"END", "552 5.3.4 too large", notify.BadPayload, "552"},
		{"END", "554 5.6.0 content", notify.BadPayload, "554"},
		{"END", "cut", notify.Ambiguous, ""},
		{"END", "250 ", "", ""}, // taken, without a word
		{"QUIT", "cut", "", ""}, // after the message was taken nothing counts
		{"QUIT", "500 what", "", ""},
	} {
		f := newFake(t, nil)
		f.then(c.step, c.reply)
		got, err := mailerOf(t, f, Options{}).Post(t.Context(), notice)
		if class(err) != c.want || err != nil && !strings.Contains(err.Error(), c.reason) || err == nil && got != receipt {
			t.Errorf("%s %s: %q, %v", c.step, c.reply, class(err), err)
		}
		if (err == nil || c.want == notify.Ambiguous) != (len(f.taken()) == 1) {
			t.Errorf("%s %s: the server took %d", c.step, c.reply, len(f.taken()))
		}
	}
}

// One recipient refused for good: nobody is sent the message, so none gets it twice later.
func TestOneRecipientRefused(t *testing.T) {
	f := newFake(t, nil)
	f.then("RCPT", "", "550 5.1.1 no such user")
	if _, err := mailerOf(t, f, Options{}).Post(t.Context(), notice); class(err) != notify.DeadChannel || len(f.taken()) > 0 {
		t.Errorf("%v, %d taken", err, len(f.mails))
	}
}

// Slow answers end at the time set: before the end of the message nothing was sent, after it it may have been.
func TestSlowAnswers(t *testing.T) {
	for step, want := range map[string]notify.Class{"greet": notify.Retry, "STARTTLS": notify.Retry, "AUTH": notify.Retry, "MAIL": notify.Retry,
		"RCPT": notify.Retry, "DATA": notify.Retry, "END": notify.Ambiguous} {
		f := newFake(t, nil)
		f.then(step, "hang")
		if _, err := mailerOf(t, f, Options{Timeout: 300 * time.Millisecond}).Post(t.Context(), notice); class(err) != want {
			t.Errorf("%s: %q, %v", step, class(err), err)
		}
	}
}

// A stop cuts the call off, whatever it waits for; the time set has not passed.
func TestStopped(t *testing.T) {
	for step, want := range map[string]notify.Class{"greet": notify.Retry, "RCPT": notify.Retry, "END": notify.Ambiguous} {
		f := newFake(t, nil)
		f.then(step, "hang")
		ctx, cancel := context.WithTimeout(t.Context(), 300*time.Millisecond)
		_, err := mailerOf(t, f, Options{Timeout: time.Hour}).Post(ctx, notice)
		cancel()
		if class(err) != want {
			t.Errorf("%s: %q, %v", step, class(err), err)
		}
	}
}

// Nothing goes out unencrypted, nor to a server that is another than it says.
func TestEncryption(t *testing.T) {
	for what, c := range map[string]struct {
		more   func(*fake)
		o      Options
		want   notify.Class
		reason string
	}{
		"no STARTTLS":  {func(f *fake) { f.plain = true }, Options{}, notify.DeadAll, "does not support STARTTLS"},
		"not trusted":  {nil, Options{TLS: newFake(t, nil).trusts()}, notify.Retry, "certificate"},
		"implicit too": {func(f *fake) { f.implicit = true }, Options{TLS: newFake(t, nil).trusts()}, notify.Retry, "certificate"},
		"no sign-in":   {func(f *fake) { f.noAuth = true }, Options{}, notify.DeadAll, "does not support SMTP AUTH"},
	} {
		f := newFake(t, c.more)
		_, err := mailerOf(t, f, c.o).Post(t.Context(), notice)
		if class(err) != c.want || !strings.Contains(fmt.Sprint(err), c.reason) || len(f.taken())+len(f.auths) > 0 {
			t.Errorf("%s: %q, %v; %d taken", what, class(err), err, len(f.mails))
		}
	}
	f := newFake(t, nil)
	m, err := New(Account{Server: f.Addr().String(), Security: None, From: "a@example.org", To: []string{"b@example.org"}}, notify.Secret{}, notify.Secret{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := m.Post(t.Context(), notice); err != nil || len(f.taken()) != 1 || len(f.auths) > 0 {
		t.Errorf("on this machine without encryption: %v, %d taken, signed in %q", err, len(f.mails), f.auths)
	}
	_ = f.Close()
	if _, err := m.Post(t.Context(), notice); class(err) != notify.Retry || !strings.HasPrefix(err.Error(), "not reached: ") {
		t.Errorf("nobody there: %q, %v", class(err), err)
	}
}

func TestAccounts(t *testing.T) {
	good := Account{Server: "mail.example.org:587", Security: StartTLS, From: "a@example.org", To: []string{"b@example.org"}}
	for what, change := range map[string]func(*Account){
		"": func(*Account) {}, "no port": func(a *Account) { a.Server = "mail.example.org" }, "port 0": func(a *Account) { a.Server = "h:0" },
		"port 65536": func(a *Account) { a.Server = "h:65536" }, "no host": func(a *Account) { a.Server = ":25" }, "plain": func(a *Account) { a.Security = None },
		"unknown": func(a *Account) { a.Security = "ssl" }, "from": func(a *Account) { a.From = "a" }, "to": func(a *Account) { a.To = []string{"b@example.org", "c"} },
		"nobody": func(a *Account) { a.To = nil }, "beyond ASCII": func(a *Account) { a.From = "\u00e4@example.org" },
	} {
		a := good
		change(&a)
		if _, err := New(a, notify.Secret{}, notify.Secret{}, Options{}); (err == nil) != (what == "") {
			t.Errorf("%s: %v", what, err)
		}
	}
	for _, c := range [][2]notify.Secret{{notify.NewSecret("u"), {}}, {{}, notify.NewSecret("p")}} {
		if _, err := New(good, c[0], c[1], Options{}); err == nil {
			t.Error("half of the credentials is taken")
		}
	}
}

func TestCheck(t *testing.T) {
	f := newFake(t, nil)
	said, err := mailerOf(t, f, Options{}).Check(t.Context())
	if err != nil || said != "server "+f.Addr().String()+" answers (starttls), signed in" || len(f.taken()) > 0 {
		t.Errorf("%q, %v", said, err)
	}
	f.then("AUTH", "535 no")
	if _, err := mailerOf(t, f, Options{}).Check(t.Context()); err == nil || !strings.Contains(err.Error(), "535 no: the user or the password is wrong") {
		t.Error(err)
	}
}

// Whatever the server answers, nothing holds user or password: the fake repeats both, as they are and as they were sent.
func TestNoErrorHoldsASecret(t *testing.T) {
	f := newFake(t, nil)
	sent := base64.StdEncoding.EncodeToString([]byte("\x00" + user + "\x00" + password))
	f.then("AUTH", "535 you said "+password+" as "+user, "454 "+sent, "")
	f.then("MAIL", "550 "+user+" with "+password)
	m := mailerOf(t, f, Options{})
	var all strings.Builder
	for range 3 {
		_, err := m.Post(t.Context(), notice)
		fmt.Fprintf(&all, "%v %+v %#v\n", err, err, err)
	}
	f.then("AUTH", "535 "+password)
	_, err := m.Check(t.Context())
	fmt.Fprintf(&all, "%v\n%v %+v %#v %s\n", err, m, m, m, m)
	if text, err := json.Marshal([]any{m}); err == nil {
		all.Write(text)
	}
	for _, s := range []string{password, user, "swordfish", sent} {
		if strings.Contains(all.String(), s) {
			t.Errorf("%q shows in\n%s", s, all.String())
		}
	}
	if strings.Count(all.String(), "***") < 4 {
		t.Error("nothing was hidden, so nothing was tried")
	}
}

// The certificate must be the named host's.
func TestHostIsChecked(t *testing.T) {
	f := newFake(t, nil)
	_, port, _ := net.SplitHostPort(f.Addr().String())
	m := mailerOf(t, f, Options{}, func(a *Account) { a.Server = "localhost:" + port })
	if _, err := m.Post(t.Context(), notice); class(err) != notify.Retry || !strings.Contains(err.Error(), "localhost") {
		t.Errorf("%q, %v", class(err), err)
	}
}

// A picture comes within the mail: the words as text, the same as a page, and the picture that the page shows, with its words. Nothing that a
// file holds becomes markup.
func TestPictureInTheMail(t *testing.T) {
	f := newFake(t, nil)
	p := &notify.Picture{Name: "strayd-7.png", PNG: []byte("\x89PNG\r\nnot quite"), Text: `60 returns of <alder> & "birch"`}
	n := notice
	n.Lines = []string{"BREACH <script>alert(1)</script> returned -4.12 %", "second & last"}
	if _, err := mailerOf(t, f, Options{}).PostWith(context.Background(), n, p); err != nil {
		t.Fatal(err)
	}
	_, m, body := read(t, f.mails[0])
	parts := partsOf(t, m.Header.Get("Content-Type"), body)
	if got, want := parts["text/plain"], "BREACH <script>alert(1)</script> returned -4.12 %\r\nsecond & last\r\n"; got != want {
		t.Errorf("text %q, want %q", got, want)
	}
	page := parts["text/html"]
	for _, want := range []string{"<p>BREACH &lt;script&gt;alert(1)&lt;/script&gt; returned -4.12 %</p>", `src="cid:strayd-7.png"`,
		`alt="60 returns of &lt;alder&gt; &amp; &#34;birch&#34;"`} {
		if !strings.Contains(page, want) {
			t.Errorf("the page lacks %s:\n%s", want, page)
		}
	}
	if parts["image/png"] != string(p.PNG) || parts["id image/png"] != "<strayd-7.png>" {
		t.Errorf("picture %q, id %q", parts["image/png"], parts["id image/png"])
	}
}

// partsOf takes the parts of a mail apart, by their kinds.
func partsOf(t *testing.T, kind, body string) map[string]string {
	t.Helper()
	out := map[string]string{}
	media, params, err := mime.ParseMediaType(kind)
	if err != nil {
		t.Fatalf("%q: %v", kind, err)
	}
	if !strings.HasPrefix(media, "multipart/") {
		return map[string]string{media: body}
	}
	in := multipart.NewReader(strings.NewReader(body), params["boundary"])
	for {
		part, err := in.NextPart()
		if err != nil {
			return out
		}
		var content io.Reader = part
		if part.Header.Get("Content-Transfer-Encoding") == "base64" {
			content = base64.NewDecoder(base64.StdEncoding, part)
		}
		b, err := io.ReadAll(content)
		if err != nil {
			t.Fatal(err)
		}
		for k, v := range partsOf(t, part.Header.Get("Content-Type"), string(b)) {
			out[k] = v
		}
		inner, _, _ := mime.ParseMediaType(part.Header.Get("Content-Type"))
		out["id "+inner] = part.Header.Get("Content-ID")
	}
}

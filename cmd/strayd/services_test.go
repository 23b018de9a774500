package main

import (
	"bufio"
	"encoding/base64"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync"
	"testing"

	"strayd/notify"
	"strayd/notify/webhook"
)

// What the receivers of the tests take. None of it must be seen anywhere else.
const (
	hookSecret   = "hook-9999-secret-of-the-tests"
	hookPlace    = "hook-place-8888"
	mailUser     = "mail-user-6666"
	mailPassword = "mail-word-5555-of-the-tests"
)

// credentials are those of the two, as the environment has them.
func credentials() []string {
	return []string{"STRAYD_WEBHOOK_SECRET=" + hookSecret, "STRAYD_MAIL_USER=" + mailUser, "STRAYD_MAIL_PASSWORD=" + mailPassword}
}

// services stand for a receiver of a webhook and a mail server. Where told to be mean, they refuse all, and say back what they were given.
type services struct {
	hook *httptest.Server
	mail net.Listener
	mean bool

	mu     sync.Mutex
	bodies []string // of the hook's requests with a good signature
	mails  []string
}

func newServices(t *testing.T, mean bool) *services {
	s := &services{mean: mean}
	s.hook = httptest.NewServer(http.HandlerFunc(s.receive))
	var err error
	if s.mail, err = net.Listen("tcp", "127.0.0.1:0"); err != nil {
		t.Fatal(err)
	}
	go func() {
		for {
			conn, err := s.mail.Accept()
			if err != nil {
				return
			}
			go s.talk(conn)
		}
	}()
	t.Cleanup(func() { s.hook.Close(); s.mail.Close() })
	return s
}

// channels are the configuration's lines for the two.
func (s *services) channels() string {
	return fmt.Sprintf(`  - {name: hook, webhook: {url: "%s/%s"}}
  - {name: post, mail: {to: [desk@example.org], from: strayd@example.org, server: "%s", tls: none}}
`, s.hook.URL, hookPlace, s.mail.Addr())
}

// receive takes a notice whose signature is right (RFC 2104 over time and body), and refuses any other.
func (s *services) receive(w http.ResponseWriter, r *http.Request) {
	body, _ := io.ReadAll(r.Body)
	var at int64
	_, _ = fmt.Sscan(r.Header.Get(webhook.TimeHeader), &at)
	good := r.Header.Get(webhook.SignatureHeader) == webhook.Signature(notify.NewSecret(hookSecret), at, body)
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.mean || !good {
		w.WriteHeader(http.StatusUnauthorized)
		fmt.Fprintf(w, "at %s the secret is %s", r.URL, hookSecret)
		return
	}
	s.bodies = append(s.bodies, string(body))
}

// talk is one connection to the mail server: as much of RFC 5321 and 4954 as a client needs.
func (s *services) talk(conn net.Conn) {
	defer conn.Close()
	in := bufio.NewReader(conn)
	say := func(line string) { fmt.Fprintf(conn, "%s\r\n", line) }
	say("220 ready")
	for {
		line, err := in.ReadString('\n')
		if err != nil {
			return
		}
		switch line = strings.TrimSpace(line); strings.ToUpper(strings.Fields(line + " ?")[0]) {
		case "EHLO":
			say("250-here\r\n250 AUTH PLAIN")
		case "AUTH":
			text, _ := base64.StdEncoding.DecodeString(line[strings.LastIndexByte(line, ' ')+1:])
			if s.mean || string(text) != "\x00"+mailUser+"\x00"+mailPassword {
				say(fmt.Sprintf("535 wrong: %s is %q", line, text))
				continue
			}
			say("235 welcome")
		case "DATA":
			say("354 go on")
			s.take(in)
			say("250 taken")
		case "QUIT":
			say("221 bye")
			return
		default:
			say("250 ok")
		}
	}
}

func (s *services) take(in *bufio.Reader) {
	var text strings.Builder
	for {
		line, err := in.ReadString('\n')
		if err != nil || line == ".\r\n" {
			break
		}
		text.WriteString(line)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.mails = append(s.mails, text.String())
}

// check asks webhook and mail server, and with --send has each told; what it says is what a person needs.
func TestCheckSendsToServices(t *testing.T) {
	s := newServices(t, false)
	f := deskFolder(t)
	f.configure(deskConfig() + s.channels())
	want := f.checks
	want(exitDone, nil, "channel hook (webhook): not asked: no secret", "channel post (mail): server "+s.mail.Addr().String()+" answers (none); without a user")
	want(exitFailed, []string{"--send"}, "channel hook (webhook): does not deliver: no secret")
	for _, e := range credentials() {
		name, value, _ := strings.Cut(e, "=")
		t.Setenv(name, value)
	}
	want(exitDone, nil, "channel hook (webhook): signs with the secret found", "channel post (mail): server "+s.mail.Addr().String()+" answers (none), signed in")
	s.mails, s.bodies = nil, nil
	want(exitDone, []string{"--send"}, "channel hook (webhook): the test arrived", "channel post (mail): the test arrived as <")
	if len(s.bodies) != 1 || !strings.Contains(s.bodies[0], `"kind":"test"`) || !strings.Contains(s.bodies[0], "TEST of channel hook") {
		t.Errorf("the receiver has %q", s.bodies)
	}
	if len(s.mails) != 1 || !strings.Contains(s.mails[0], "Subject: TEST of channel post") {
		t.Errorf("the mail server has %q", s.mails)
	}
	t.Setenv("STRAYD_WEBHOOK_SECRET", "another-secret-of-16-letters")
	t.Setenv("STRAYD_MAIL_PASSWORD", "no-such-phrase-4444")
	want(exitFailed, []string{"--send"}, "channel hook (webhook): does not deliver: dead channel: HTTP status 401 Unauthorized: the signature was refused",
		"channel post (mail): does not deliver: dead service: the server refuses: 535", "the user or the password is wrong")
	if len(s.bodies)+len(s.mails) != 2 {
		t.Error("with wrong credentials something arrives")
	}
}

package mail

import (
	"bufio"
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/tls"
	"crypto/x509"
	"encoding/base64"
	"fmt"
	"math/big"
	"net"
	"strings"
	"sync"
	"testing"
	"time"
)

const (
	user     = "strayd-user"
	password = "swordfish und \u00fcber/alles+9"
)

// fake stands for a mail server that speaks as much of RFC 5321, 3207 and 4954 as a client needs. The reply to a command is the next of
// that command's script, without one the server's own. A reply of "cut" hangs up instead, "hang" says nothing until the end of the test.
type fake struct {
	net.Listener
	t        *testing.T
	tls      *tls.Config
	implicit bool
	plain    bool // offers no STARTTLS
	noAuth   bool // offers no way to sign in
	done     chan struct{}

	mu      sync.Mutex
	script  map[string][]string
	heard   []string // commands
	mails   []string // what was taken, with the envelope before it
	auths   []string // credentials that came
	inPlain []string // commands after EHLO that came in plain text
}

func newFake(t *testing.T, more func(*fake)) *fake {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	f := &fake{Listener: l, t: t, script: map[string][]string{}, done: make(chan struct{}), tls: &tls.Config{Certificates: []tls.Certificate{certificate(t)}}}
	if more != nil {
		more(f)
	}
	var all sync.WaitGroup
	all.Go(func() {
		for {
			conn, err := l.Accept()
			if err != nil {
				return
			}
			all.Go(func() { f.talk(conn) })
		}
	})
	t.Cleanup(func() { close(f.done); _ = l.Close(); all.Wait() })
	return f
}

// certificate is one for 127.0.0.1, signed by itself.
func certificate(t *testing.T) tls.Certificate {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	c := &x509.Certificate{SerialNumber: big.NewInt(1), NotAfter: time.Now().Add(time.Hour), IPAddresses: []net.IP{net.IPv4(127, 0, 0, 1)}, IsCA: true,
		BasicConstraintsValid: true}
	der, err := x509.CreateCertificate(rand.Reader, c, c, &key.PublicKey, key)
	if err != nil {
		t.Fatal(err)
	}
	leaf, err := x509.ParseCertificate(der)
	if err != nil {
		t.Fatal(err)
	}
	return tls.Certificate{Certificate: [][]byte{der}, PrivateKey: key, Leaf: leaf}
}

// trusts is a client's configuration that trusts the fake.
func (f *fake) trusts() *tls.Config {
	pool := x509.NewCertPool()
	pool.AddCert(f.tls.Certificates[0].Leaf)
	return &tls.Config{RootCAs: pool}
}

// talker is one connection.
type talker struct {
	f         *fake
	conn      net.Conn
	in        *bufio.Reader
	encrypted bool
	envelope  []string
}

func (f *fake) talk(conn net.Conn) {
	c := &talker{f: f, conn: conn}
	defer func() { _ = c.conn.Close() }()
	if f.implicit {
		c.encrypt()
	}
	c.in = bufio.NewReader(c.conn)
	if !c.say("greet", "220 fake ready") {
		return
	}
	for {
		line, err := c.in.ReadString('\n')
		if err != nil {
			return
		}
		if !c.answer(strings.TrimRight(line, "\r\n")) {
			return
		}
	}
}

func (c *talker) encrypt() {
	c.conn = tls.Server(c.conn, c.f.tls)
	c.in, c.encrypted = bufio.NewReader(c.conn), true
}

// say gives the next reply of a command's script, or the usual one. It is false when the connection ends.
func (c *talker) say(command, usual string) bool {
	c.f.mu.Lock()
	if s := c.f.script[command]; len(s) > 0 {
		if s[0] != "" {
			usual = s[0]
		}
		c.f.script[command] = s[1:]
	}
	c.f.mu.Unlock()
	switch usual {
	case "cut":
		return false
	case "hang":
		<-c.f.done
		return false
	}
	_, err := fmt.Fprint(c.conn, strings.ReplaceAll(usual, "\n", "\r\n")+"\r\n")
	return err == nil && !strings.HasPrefix(usual, "421")
}

func (c *talker) answer(line string) bool {
	verb := strings.ToUpper(strings.Fields(line + " ?")[0])
	c.f.note(verb, line, c.encrypted)
	switch verb {
	case "EHLO":
		return c.say("EHLO", c.offers())
	case "STARTTLS":
		if !c.say("STARTTLS", "220 go ahead") {
			return false
		}
		c.encrypt()
		return true
	case "AUTH":
		return c.signIn(line)
	case "MAIL", "RCPT":
		c.envelope = append(c.envelope, line)
		return c.say(verb, "250 ok")
	case "DATA":
		return c.data()
	case "QUIT":
		c.say("QUIT", "221 bye")
		return false
	}
	return c.say(verb, "250 ok")
}

func (f *fake) note(verb, line string, encrypted bool) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.heard = append(f.heard, verb)
	if !encrypted && verb != "EHLO" && verb != "STARTTLS" {
		f.inPlain = append(f.inPlain, line)
	}
}

func (c *talker) offers() string {
	s := "250-fake\n250-8BITMIME\n250-SMTPUTF8\n250-ENHANCEDSTATUSCODES\n"
	if !c.encrypted && !c.f.plain {
		s += "250-STARTTLS\n"
	}
	if !c.f.noAuth {
		s += "250-AUTH LOGIN PLAIN\n"
	}
	return s + "250 SIZE 1000000"
}

func (c *talker) signIn(line string) bool {
	text, _ := base64.StdEncoding.DecodeString(strings.TrimPrefix(line, "AUTH PLAIN "))
	c.f.mu.Lock()
	c.f.auths = append(c.f.auths, string(text))
	c.f.mu.Unlock()
	if string(text) != "\x00"+user+"\x00"+password {
		return c.say("AUTH", "535 5.7.8 wrong: "+line+" "+string(text))
	}
	return c.say("AUTH", "235 welcome")
}

// data takes a message, unless the script refuses it before or after.
func (c *talker) data() bool {
	c.f.mu.Lock()
	refuses := len(c.f.script["DATA"]) > 0 && c.f.script["DATA"][0] != ""
	c.f.mu.Unlock()
	if !c.say("DATA", "354 go on") {
		return false
	}
	if refuses {
		return true
	}
	var text strings.Builder
	for {
		line, err := c.in.ReadString('\n')
		if err != nil {
			return false
		}
		if line == ".\r\n" {
			break
		}
		text.WriteString(strings.TrimPrefix(line, "."))
	}
	c.f.take(strings.Join(c.envelope, "\n") + "\n\n" + text.String())
	c.envelope = nil
	return c.say("END", "250 2.0.0 taken")
}

// take keeps a message, unless the script is about to refuse it.
func (f *fake) take(text string) {
	f.mu.Lock()
	defer f.mu.Unlock()
	if s := f.script["END"]; len(s) == 0 || s[0] == "" || s[0] == "cut" || s[0] == "hang" || s[0][0] == '2' {
		f.mails = append(f.mails, text)
	}
}

func (f *fake) taken() []string {
	f.mu.Lock()
	defer f.mu.Unlock()
	return append([]string{}, f.mails...)
}

// then adds replies to a command's script.
func (f *fake) then(command string, replies ...string) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.script[command] = append(f.script[command], replies...)
}

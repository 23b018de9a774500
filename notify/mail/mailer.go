package mail

import (
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"net"
	"net/mail"
	"strconv"
	"time"

	gomail "github.com/wneessen/go-mail"

	"strayd/notify"
)

// Security is how the connection is encrypted.
type Security string

const (
	StartTLS Security = "starttls" // from plain text on, before anything is said; RFC 3207
	Implicit Security = "implicit" // from the first byte; RFC 8314
	None     Security = "none"     // on this machine alone
)

// Account is where a mail goes through, from whom and to whom.
type Account struct {
	Server   string // host:port
	Security Security
	From     string
	To       []string
}

// User and Password are where the credentials are looked for that the server asks for, if it does.
func User() notify.Credential {
	return notify.Credential{What: "user for the mail server", File: "mail_user", Variable: "STRAYD_MAIL_USER", Phrase: true}
}

func Password() notify.Credential {
	return notify.Credential{What: "password for the mail server", File: "mail_password", Variable: "STRAYD_MAIL_PASSWORD", Phrase: true}
}

// Options of a Mailer. The zero value is for use.
type Options struct {
	Timeout time.Duration // to reach the server, and of the message after that; 60 s when 0
	TLS     *tls.Config   // for tests; the system's roots when nil
	Now     func() time.Time
}

// Mailer sends mail by one account.
type Mailer struct {
	account        Account
	host           string
	port           int
	from           *mail.Address
	to             []*mail.Address
	user, password notify.Secret
	o              Options
}

// New prepares a mailer; nothing is called yet. Without user and password the server is not told who sends.
func New(a Account, user, password notify.Secret, o Options) (*Mailer, error) {
	m := &Mailer{account: a, user: user, password: password, o: o}
	if o.Timeout == 0 {
		m.o.Timeout = time.Minute // RFC 5321, 4.5.3.2 asks for patience; a repeat costs more than a wait
	}
	if o.Now == nil {
		m.o.Now = time.Now
	}
	if user.Empty() != password.Empty() {
		return nil, errors.New("mail server: a user without a password, or a password without a user")
	}
	host, port, err := net.SplitHostPort(a.Server)
	if m.port, _ = strconv.Atoi(port); err != nil || host == "" || m.port < 1 || m.port > 65535 {
		return nil, fmt.Errorf("mail server %q: need host:port, such as mail.example.org:587", a.Server)
	}
	m.host = host
	switch {
	case a.Security != StartTLS && a.Security != Implicit && a.Security != None:
		return nil, fmt.Errorf("mail server %s: encryption %q is not known", a.Server, a.Security)
	case a.Security == None && !Loopback(host):
		return nil, fmt.Errorf("mail server %s: need starttls or implicit beyond this machine", a.Server)
	case len(a.To) == 0:
		return nil, errors.New("mail: no recipient")
	}
	return m, m.addresses()
}

// Loopback says whether a host is this machine.
func Loopback(host string) bool {
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}

func (m *Mailer) addresses() (err error) {
	if m.from, err = address(m.account.From); err != nil {
		return err
	}
	for _, text := range m.account.To {
		a, err := address(text)
		if err != nil {
			return err
		}
		m.to = append(m.to, a)
	}
	return nil
}

// address reads one address of ASCII, with or without a name before it.
func address(text string) (*mail.Address, error) {
	a, err := mail.ParseAddress(text)
	if err != nil {
		return nil, fmt.Errorf("mail address %q: %w", text, err)
	}
	for _, b := range []byte(a.Address) {
		if b <= ' ' || b > '~' {
			return nil, fmt.Errorf("mail address %q: a character beyond ASCII", text)
		}
	}
	return a, nil
}

// String names the mailer by its server.
func (m *Mailer) String() string { return "mail through " + m.account.Server }

// call is one connection to the server, closed when its context ends: the library asks the context only until it is connected.
type call struct {
	ctx  context.Context
	conn net.Conn // nil when there was none
	stop func() bool
}

func (c *call) end() {
	if c.conn != nil {
		c.stop()
		_ = c.conn.Close() // the outcome stands by then
	}
}

// client is the library's client of one call. It never logs.
func (m *Mailer) client(c *call) (*gomail.Client, error) {
	policy := gomail.NoTLS // the connection is encrypted before the library has it, or need not be
	if m.account.Security == StartTLS {
		policy = gomail.TLSMandatory
	}
	options := []gomail.Option{gomail.WithPort(m.port), gomail.WithTimeout(m.o.Timeout), gomail.WithTLSPolicy(policy),
		gomail.WithTLSConfig(m.tls()), gomail.WithoutNoop(), gomail.WithoutRset(), gomail.WithoutSMTPUTF8(), gomail.WithDialContextFunc(m.dial(c))}
	if !m.user.Empty() {
		options = append(options, gomail.WithUsername(m.user.Reveal()), gomail.WithPassword(m.password.Reveal()),
			gomail.WithOpportunisticSMTPAuth(gomail.SMTPAuthSCRAMSHA256, gomail.SMTPAuthSCRAMSHA1, gomail.SMTPAuthPlain, gomail.SMTPAuthLogin))
	}
	return gomail.NewClient(m.host, options...)
}

func (m *Mailer) tls() *tls.Config {
	config := &tls.Config{MinVersion: tls.VersionTLS12}
	if m.o.TLS != nil {
		config = m.o.TLS.Clone()
	}
	config.ServerName = m.host
	return config
}

// dial connects, and keeps the connection in the call.
func (m *Mailer) dial(c *call) gomail.DialContextFunc {
	return func(ctx context.Context, network, at string) (net.Conn, error) {
		var d interface {
			DialContext(ctx context.Context, network, address string) (net.Conn, error)
		} = &net.Dialer{}
		if m.account.Security == Implicit {
			d = &tls.Dialer{Config: m.tls()}
		}
		conn, err := d.DialContext(ctx, network, net.JoinHostPort(m.host, strconv.Itoa(m.port)))
		if err == nil {
			c.conn, c.stop = conn, context.AfterFunc(c.ctx, func() { _ = conn.Close() })
		}
		return conn, err
	}
}

package mail

import (
	"context"
	"fmt"
	"strings"
	"time"

	gomail "github.com/wneessen/go-mail"

	"strayd/notify"
	"strayd/rules"
)

// quitMost is how long a goodbye may take.
const quitMost = 2 * time.Second

// Post makes one attempt. The receipt is the Message-ID.
func (m *Mailer) Post(ctx context.Context, n rules.Notice) (string, error) {
	msg := m.message(n)
	c := call{ctx: ctx}
	defer c.end()
	client, err := m.client(&c)
	if err != nil {
		return "", m.hide(&notify.Failure{Class: notify.DeadAll, Reason: err.Error()})
	}
	server, err := client.DialToSMTPClientWithContext(ctx)
	if err != nil {
		return "", m.hide(unreached(err, c.conn != nil))
	}
	err = client.SendWithSMTPClient(server, msg)
	if msg.IsDelivered() {
		_ = c.conn.SetDeadline(time.Now().Add(quitMost))
		_ = server.Quit() // a courtesy: the server has taken the message
		return msg.GetMessageID(), nil
	}
	if err == nil {
		return "", &notify.Failure{Class: notify.Ambiguous, Reason: "no error, and no answer to the message"}
	}
	return "", m.hide(refused(err))
}

// message lays a notice out as a mail. Long lines and letters beyond ASCII are encoded by the library.
func (m *Mailer) message(n rules.Notice) *gomail.Msg {
	msg := gomail.NewMsg(gomail.WithNoDefaultUserAgent(), gomail.WithCharset(gomail.CharsetUTF8), gomail.WithEncoding(gomail.EncodingQP))
	msg.FromMailAddress(m.from)
	msg.ToMailAddress(m.to...)
	msg.Subject(subject(n.Lines))
	msg.SetDateWithValue(m.o.Now())
	msg.SetMessageIDWithValue(notify.Identity(n) + "@" + domain(m.from.Address))
	msg.SetGenHeader("Auto-Submitted", "auto-generated") // RFC 3834: no answers of absence
	if strings.HasPrefix(n.Under, "<") {                 // a receipt of ours: of another channel's it may be anything
		msg.SetGenHeader(gomail.HeaderInReplyTo, n.Under)
		msg.SetGenHeader(gomail.HeaderReferences, n.Under)
	}
	msg.SetBodyString(gomail.TypeTextPlain, strings.Join(n.Lines, "\r\n")+"\r\n")
	return msg
}

// subject is the first line. Whatever could end a header ends nothing.
func subject(lines []string) string {
	if len(lines) == 0 {
		return ""
	}
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return ' '
		}
		return r
	}, lines[0])
}

func domain(address string) string { return address[strings.LastIndexByte(address, '@')+1:] }

// Check connects, encrypts and signs in, and sends nothing. The error is what keeps notices from arriving.
func (m *Mailer) Check(ctx context.Context) (said string, err error) {
	c := call{ctx: ctx}
	defer c.end()
	client, err := m.client(&c)
	if err != nil {
		return "", m.hide(&notify.Failure{Class: notify.DeadAll, Reason: err.Error()})
	}
	server, err := client.DialToSMTPClientWithContext(ctx)
	if err != nil {
		return "", m.hide(unreached(err, c.conn != nil))
	}
	_ = server.Quit()
	said = fmt.Sprintf("server %s answers (%s)", m.account.Server, m.account.Security)
	if m.user.Empty() {
		return said + "; without a user: it may refuse to pass mail on", nil
	}
	return said + ", signed in", nil
}

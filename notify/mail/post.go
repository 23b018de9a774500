package mail

import (
	"bytes"
	"context"
	"fmt"
	"html"
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
	return m.PostWith(ctx, n, nil)
}

// PostPlain makes one attempt without a picture, which the server may have found too large.
func (m *Mailer) PostPlain(ctx context.Context, n rules.Notice) (string, error) {
	return m.PostWith(ctx, n, nil)
}

// PostWith is Post with a picture in the mail, nil for none.
func (m *Mailer) PostWith(ctx context.Context, n rules.Notice, p *notify.Picture) (string, error) {
	msg, err := m.message(n, p)
	if err != nil {
		return "", err
	}
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

// message lays a notice out as a mail. Long lines and letters beyond ASCII are encoded by the library. With a picture, the same words follow once
// more as a page that shows it below them, for who reads pages.
func (m *Mailer) message(n rules.Notice, p *notify.Picture) (*gomail.Msg, error) {
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
	if p == nil {
		return msg, nil
	}
	msg.AddAlternativeString(gomail.TypeTextHTML, page(n.Lines, p))
	return msg, msg.EmbedReader(p.Name, bytes.NewReader(p.PNG), gomail.WithFileContentType("image/png"))
}

// page is a notice as a page with its picture.
func page(lines []string, p *notify.Picture) string {
	var b strings.Builder
	b.WriteString("<html><body>\r\n")
	for _, l := range lines {
		fmt.Fprintf(&b, "<p>%s</p>\r\n", html.EscapeString(l))
	}
	fmt.Fprintf(&b, "<p><img src=\"cid:%s\" alt=\"%s\" width=\"480\"></p>\r\n</body></html>\r\n", p.Name, html.EscapeString(p.Text))
	return b.String()
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

package mail

import (
	"errors"
	"fmt"
	"net/textproto"
	"strings"

	gomail "github.com/wneessen/go-mail"

	"strayd/notify"
)

// Reply codes (RFC 5321, 4.2; RFC 4954, 6): 4yz is tried again, 5yz is for good. What a 5yz is about says at which step it came.

// unreached classes an error from before the message: nothing was sent.
func unreached(err error, connected bool) *notify.Failure {
	var reply *textproto.Error
	switch {
	case errors.As(err, &reply) && reply.Code >= 500:
		f := &notify.Failure{Class: notify.DeadAll, Reason: "the server refuses: " + told(reply)}
		if hint := signIn[reply.Code]; hint != "" {
			f.Reason += ": " + hint
		}
		return f
	case errors.As(err, &reply):
		return &notify.Failure{Class: notify.Retry, Reason: "the server is not ready: " + told(reply)}
	case errors.Is(err, gomail.ErrNoSupportedAuthDiscovered),
		connected && strings.Contains(err.Error(), "not support"): // STARTTLS, or a way to sign in: the library has no errors for them
		return &notify.Failure{Class: notify.DeadAll, Reason: err.Error()}
	}
	return &notify.Failure{Class: notify.Retry, Reason: "not reached: " + err.Error()}
}

// signIn says what a person can do about a refusal before the message.
var signIn = map[int]string{
	530: "it asks for a user and a password",
	534: "it asks for another way to sign in",
	535: "the user or the password is wrong",
	538: "it asks for encryption",
}

// told is a reply on one line.
func told(reply *textproto.Error) string {
	return fmt.Sprintf("%d %s", reply.Code, strings.Join(strings.Fields(reply.Msg), " "))
}

// refused classes an error of the message.
func refused(err error) *notify.Failure {
	var send *gomail.SendError
	if !errors.As(err, &send) {
		return &notify.Failure{Class: notify.Ambiguous, Reason: err.Error()}
	}
	f := &notify.Failure{Class: notify.Retry, Reason: strings.Join(strings.Fields(send.Error()), " ")}
	if at := strings.Index(f.Reason, ", affected message ID"); at > 0 {
		f.Reason = f.Reason[:at]
	}
	code := send.ErrorCode()
	switch {
	case code == 0 && send.Reason == gomail.ErrSMTPDataClose:
		f.Class = notify.Ambiguous
	case code < 500:
	case code == 530 || code == 535 || code == 538:
		f.Class = notify.DeadAll
	case send.Reason == gomail.ErrSMTPDataClose || code == 552: // the content, or its size
		f.Class = notify.BadPayload
	default: // the sender, a recipient, or mail from here at all
		f.Class = notify.DeadChannel
	}
	if f.Class == notify.DeadChannel && send.Reason == gomail.ErrSMTPRcptTo {
		f.Reason += "; nobody was sent it: take the address out of the configuration"
	}
	return f
}

// hide takes the credentials out of a failure, also in the form in which they are sent (RFC 4616).
func (m *Mailer) hide(f *notify.Failure) *notify.Failure {
	if m.user.Empty() {
		return f
	}
	both := notify.NewSecret("\x00" + m.user.Reveal() + "\x00" + m.password.Reveal())
	f.Reason = m.password.Redact(m.user.Redact(both.Redact(f.Reason)))
	return f
}

package notify

import (
	"context"
	"time"

	"strayd/rules"
)

// Channel is where notices go. Post makes one attempt, without retrying, and gives back what identifies the message there, which
// may be empty. A nil error means that the message has arrived. Any other error than a *Failure has the class Unknown.
type Channel interface {
	Post(ctx context.Context, n rules.Notice) (receipt string, err error)
}

// Finder is a channel that can tell whether an earlier attempt got through.
type Finder interface {
	Find(ctx context.Context, n rules.Notice) (found Found, receipt string)
}

// Found is the answer to whether an earlier attempt got through.
type Found int

// The zero value is the cautious one.
const (
	FoundUnknown Found = iota // the channel cannot say
	FoundNot
	FoundThere
)

// Plainer is a channel that can post a notice as bare text, for when the service does not take the message's form.
type Plainer interface {
	PostPlain(ctx context.Context, n rules.Notice) (receipt string, err error)
}

// Pacer is a channel that wants at least so much time between the starts of two calls.
type Pacer interface {
	Pace() time.Duration
}

// Class says what to do after an attempt failed.
type Class string

const (
	// Unknown is an error that nothing is known of: tried a few times, then failed.
	Unknown Class = "unknown"
	// Retry is an attempt that surely did not get through: tried again after a while.
	Retry Class = "retry"
	// Ambiguous is an attempt that may have got through.
	Ambiguous Class = "ambiguous"
	// DeadChannel stops the channel until the next start or reload; its queue waits.
	DeadChannel Class = "dead channel"
	// DeadAll stops every channel of the same service, since they share what was refused.
	DeadAll Class = "dead service"
	// BadPayload is a message that the service does not take: tried once more as bare text, then failed.
	BadPayload Class = "bad message"
)

// Failure is why an attempt failed. Reason holds no secret.
type Failure struct {
	Class  Class
	After  time.Duration // Retry: not before; 0 where the service named no time
	Reason string
}

func (f *Failure) Error() string { return f.Reason }

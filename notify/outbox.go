package notify

import (
	"time"

	"strayd/rules"
)

// Outbox is what the sending loop needs of the ledger. Each call is one durable step.
type Outbox interface {
	// Add enqueues notices; one whose key is there already is passed over.
	Add(notices []rules.Notice) error
	// Next is the oldest notice of a channel that is waiting, whatever its time; ok is false when there is none.
	Next(channel string) (n rules.Notice, ok bool, err error)
	// Waiting lists the waiting notices of a channel, the oldest first.
	Waiting(channel string) ([]rules.Notice, error)
	// Sending lists the notices of a channel whose last attempt has no recorded outcome: left by a crash.
	Sending(channel string) ([]rules.Notice, error)
	// Mark records a notice's new state under its number. Its channel may be another than before.
	Mark(n rules.Notice) error
	// Depth counts the waiting and the failed notices of a channel, and tells when the oldest waiting one was made.
	Depth(channel string) (waiting, failed int, oldest time.Time, err error)
	// Notices calls each with every notice by number, until it returns false.
	Notices(each func(rules.Notice) bool) error
}

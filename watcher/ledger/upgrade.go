package ledger

import (
	"fmt"
	"os"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"
)

// upgrade turns a ledger of one schema into one of the next. It keeps the totals right for what it changes.
type upgrade func(*bolt.Tx) error

// upgrades are those to the schemas after the first, in order: the n-th leads from schema n to schema n+1. A change of the
// layout appends one here.
func upgrades() []upgrade { return nil }

// schema is the one that this program writes.
func (o *Options) schema() uint32 { return 1 + uint32(len(o.upgrades)) }

// bringUp upgrades an older ledger in one transaction, after a copy beside it.
func (l *Ledger) bringUp(o *Options) error {
	from := l.identity.schema
	if from == o.schema() {
		return nil
	}
	if from == 0 {
		return &Foreign{l.path, "its schema is 0"}
	}
	if o.Mode == ReadOnly {
		return fmt.Errorf("ledger %s has schema %d, and this program reads schema %d: open it once with a command that writes", l.path, from,
			o.schema())
	}
	copied := fmt.Sprintf("%s.schema-%d", l.path, from)
	temp, err := beside(copied, func(f *os.File) error {
		if err := l.copyTo(f); err != nil {
			return err
		}
		return checkPages(f, nil)
	})
	if err != nil {
		return fmt.Errorf("ledger %s is not brought to schema %d, because its copy failed: %w", l.path, o.schema(), err)
	}
	if err := takeName(temp, copied); err != nil {
		return err
	}
	return l.upgradeFrom(from, o)
}

func (l *Ledger) upgradeFrom(from uint32, o *Options) (err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	i := identity{schema: o.schema(), id: l.identity.id}
	err = l.db.Update(func(tx *bolt.Tx) error {
		for n, up := range o.upgrades[from-1:] {
			if err := up(tx); err != nil {
				return fmt.Errorf("ledger %s cannot be brought to schema %d: %w", l.path, int(from)+n+1, err)
			}
		}
		return putMeta(tx.Bucket(inMeta.name()), keyIdentity, packIdentity(make([]byte, sealSize), i))
	})
	if err == nil {
		l.identity = i
	}
	return err
}

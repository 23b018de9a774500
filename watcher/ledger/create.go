package ledger

import (
	"crypto/rand"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	bolt "go.etcd.io/bbolt"
)

// create makes an empty ledger under another name and gives it its own only when it is whole: a power cut while bbolt lays
// out its first pages leaves a file that cannot be opened.
func create(path string, o *Options) error {
	if _, err := os.Lstat(path); err == nil {
		return refuse(path, ErrExists)
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+"-*")
	if err != nil {
		return err
	}
	temp := f.Name()
	defer os.Remove(temp)
	if err := f.Close(); err != nil {
		return err
	}
	if err := layOut(temp, o); err != nil {
		return fmt.Errorf("ledger %s cannot be made: %w", path, err)
	}
	return settle(temp, path)
}

// settle gives a file its name without ever replacing another, and makes that last.
func settle(temp, path string) error {
	err := os.Link(temp, path)
	if errors.Is(err, fs.ErrExist) {
		return refuse(path, ErrExists)
	}
	if err != nil { // no hard links on this file system
		err = os.Rename(temp, path)
	}
	return errors.Join(err, syncDir(filepath.Dir(path)))
}

func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}

func layOut(path string, o *Options) error {
	db, err := bolt.Open(path, 0o600, &bolt.Options{FreelistType: bolt.FreelistMapType, NoStatistics: true})
	if err != nil {
		return err
	}
	err = db.Update(func(tx *bolt.Tx) error {
		for b := range buckets {
			if _, err := tx.CreateBucket(b.name()); err != nil {
				return err
			}
		}
		return firstRows(tx.Bucket(inMeta.name()), o)
	})
	return errors.Join(err, db.Close())
}

func firstRows(meta *bolt.Bucket, o *Options) error {
	i := identity{schema: o.schema()}
	if _, err := rand.Read(i.id[:]); err != nil {
		return err
	}
	err := putMeta(meta, keyIdentity, packIdentity(make([]byte, sealSize), i))
	err = errors.Join(err, putMeta(meta, keyHead, packHead(make([]byte, sealSize), head{nextRef: 1})))
	return errors.Join(err, putMeta(meta, keyTotals, packTotals(make([]byte, sealSize), &totals{})))
}

func putMeta(meta *bolt.Bucket, key string, value []byte) error {
	seal(inMeta, []byte(key), value)
	return meta.Put([]byte(key), value)
}

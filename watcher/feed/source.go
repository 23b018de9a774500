package feed

import (
	"bufio"
	"compress/gzip"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"hash"
	"io"
	"strings"
)

// refusal is an error that refuses the file for what it holds, as against a failure to read it.
type refusal string

func (r refusal) Error() string { return string(r) }

// disk reads the bytes of a file as they lie on disk, and hashes and counts them as they pass.
type disk struct {
	ctx      context.Context
	file     io.Reader
	hash     hash.Hash
	done     int64
	size     int64
	progress func(done, total int64)
}

func newDisk(ctx context.Context, file io.Reader, size int64, progress func(done, total int64)) *disk {
	return &disk{ctx: ctx, file: file, hash: sha256.New(), size: size, progress: progress}
}

func (d *disk) Read(p []byte) (int, error) {
	if err := d.ctx.Err(); err != nil {
		return 0, err
	}
	n, err := d.file.Read(p)
	d.hash.Write(p[:n])
	d.done += int64(n)
	if d.progress != nil && n > 0 {
		d.progress(d.done, d.size)
	}
	return n, err
}

// rest reads on to the end, for the hash.
func (d *disk) rest(buf []byte) error {
	for {
		if _, err := d.Read(buf); err == io.EOF {
			return nil
		} else if err != nil {
			return err
		}
	}
}

func (d *disk) sum() (s [32]byte) {
	d.hash.Sum(s[:0])
	return s
}

// bounded counts decompressed and decoded text against the bounds.
type bounded struct {
	src    io.Reader
	disk   *disk
	limits Limits
	gzip   bool
	done   int64
}

// freeBytes is how much may be decompressed before the ratio counts.
const freeBytes = 1 << 20

func (b *bounded) Read(p []byte) (int, error) {
	n, err := b.src.Read(p)
	b.done += int64(n)
	switch {
	case b.done > b.limits.TextBytes:
		return 0, refusal(fmt.Sprintf("the text is longer than %d bytes, the limit", b.limits.TextBytes))
	case b.gzip && b.done > freeBytes+b.limits.Ratio*b.disk.done:
		return 0, refusal(fmt.Sprintf("the file swells to more than %d times its compressed size, the limit", b.limits.Ratio))
	}
	return n, b.explain(err)
}

func (b *bounded) explain(err error) error {
	switch {
	case !b.gzip || err == nil || err == io.EOF || b.disk.ctx.Err() != nil:
		return err
	case errors.Is(err, io.ErrUnexpectedEOF):
		return refusal("the compressed file is cut off")
	case errors.Is(err, gzip.ErrHeader):
		return refusal("bytes that are not gzip stand where a compressed part should begin")
	case errors.Is(err, gzip.ErrChecksum):
		return refusal("the compressed file is damaged: its checksum does not match")
	case strings.HasPrefix(err.Error(), "flate:"):
		return refusal("the compressed file is damaged: " + err.Error())
	}
	return err
}

// opened gives the decoded text of a file.
func (m *merger) opened(d *disk, name string) (io.Reader, error) {
	if m.grid != nil {
		return m.grid, nil
	}
	p := m.plan
	b := &bounded{src: d, disk: d, limits: p.limits, gzip: strings.HasSuffix(name, gzipSuffix)}
	if b.gzip {
		z, err := gzip.NewReader(bufio.NewReaderSize(d, 1<<18))
		if err == io.EOF {
			return nil, refusal("the file is empty")
		} else if err != nil {
			return nil, b.explain(err)
		}
		b.src = z
	}
	return p.decoded(b)
}

const gzipSuffix = ".gz"

package parquet

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"runtime/debug"
	"slices"
	"strings"

	"github.com/klauspost/compress/snappy"
	"github.com/klauspost/compress/zstd"
	pq "github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/encoding/thrift"
	"github.com/parquet-go/parquet-go/format"

	"strayd/watcher"
)

// Bounds of what the library is let near. The page sizes of writers in use are 1 MiB and less.
const (
	mostFooter = 8 << 20  // bytes of the description at the end of a file
	mostHeader = 64 << 10 // bytes of a page's header
	mostPage   = 64 << 20 // bytes of a page, unpacked
	mostValues = 8 << 20  // of a page
	mostLeaf   = 1 << 31  // rows of a file
)

// unfit is why the whole file is refused.
func unfit(format string, args ...any) *watcher.GridFault {
	return &watcher.GridFault{Row: -1, Column: -1, Reason: fmt.Sprintf(format, args...)}
}

// checkEnds looks at both ends of a file, where its mark stands, and at the size of the description.
func checkEnds(file io.ReaderAt, size int64) error {
	var head [4]byte
	var tail [8]byte
	if size < 12 {
		return unfit("the file is too short for a Parquet file, or empty")
	}
	if _, err := file.ReadAt(head[:], 0); err != nil {
		return err
	}
	if _, err := file.ReadAt(tail[:], size-8); err != nil {
		return err
	}
	footer := int64(binary.LittleEndian.Uint32(tail[:4]))
	switch {
	case string(head[:]) == "PARE" || string(tail[4:]) == "PARE":
		return unfit("the Parquet file is encrypted")
	case string(head[:]) != "PAR1":
		return unfit("this is no Parquet file: it does not begin with PAR1")
	case string(tail[4:]) != "PAR1":
		return unfit("the Parquet file is cut off: it does not end with PAR1")
	case footer > size-12 || footer > mostFooter:
		return unfit("the Parquet file is damaged: its description of %d bytes does not fit", footer)
	}
	return checkFooter(file, size, footer)
}

// guard walks over the pages of a file before the library reads them.
type guard struct {
	file   io.ReaderAt
	size   int64
	bounds watcher.GridBounds
	total  int64 // bytes unpacked

	optional []bool // by leaf: cells may be without value
}

// check holds every page of every leaf against the bounds, and the pages' counts against each other.
func (g *guard) check(meta *format.FileMetaData, leaves int) error {
	rows := int64(0)
	for _, group := range meta.RowGroups {
		if len(group.Columns) != leaves || group.NumRows < 0 {
			return unfit("the Parquet file is damaged: a row group has %d columns, the table %d", len(group.Columns), leaves)
		}
		if rows += group.NumRows; rows > mostLeaf {
			return unfit("the table has more than %d rows, the limit", mostLeaf)
		}
		for i := range group.Columns {
			if err := g.leaf(&group.Columns[i].MetaData, group.NumRows, g.optional[i]); err != nil {
				return err
			}
		}
	}
	if rows != meta.NumRows {
		return unfit("the Parquet file is damaged: it says %d rows and has %d", meta.NumRows, rows)
	}
	return nil
}

// codecs are the ways to pack pages that are read.
var codecs = []format.CompressionCodec{format.Uncompressed, format.Snappy, format.Gzip, format.Zstd}

func (g *guard) leaf(m *format.ColumnMetaData, rows int64, optional bool) error {
	name := fmt.Sprintf("%q", strings.Join(m.PathInSchema, "."))
	from := m.DataPageOffset
	if m.DictionaryPageOffset > 0 {
		from = min(from, m.DictionaryPageOffset)
	}
	switch {
	case !slices.Contains(codecs, m.Codec):
		return unfit("column %s is packed by %s; deliver it unpacked or by snappy, gzip or zstd", name, m.Codec)
	case from < 4 || m.TotalCompressedSize < 0 || from > g.size-m.TotalCompressedSize:
		return unfit("the Parquet file is damaged or cut off: column %s does not lie within it", name)
	}
	r := bufio.NewReaderSize(io.NewSectionReader(g.file, from, m.TotalCompressedSize), mostHeader)
	decoder := thrift.NewDecoder(new(thrift.CompactProtocol).NewReader(r))
	seen := int64(0)
	for seen < rows {
		// First from bytes that are there, where no length can claim more than they hold; then as a stream, to step over it.
		begins, err := r.Peek(mostHeader)
		if err != nil && err != io.EOF {
			return err
		}
		h := new(format.PageHeader)
		if err = thrift.NewDecoder(new(thrift.CompactProtocol).NewReaderFromBytes(begins)).Decode(new(format.PageHeader)); err == nil {
			err = decoder.Decode(h)
		}
		if err != nil {
			return unfit("the Parquet file is damaged: a page of column %s cannot be read", name)
		}
		values, err := g.page(h, m.Codec, r, optional)
		if err != nil {
			return of(name, err)
		}
		if seen += values; seen > rows {
			return unfit("the Parquet file is damaged: column %s has more than the %d values of its rows", name, rows)
		}
	}
	return nil
}

// of names the column in a fault.
func of(name string, err error) error {
	if fault, ok := err.(*watcher.GridFault); ok {
		return unfit("column %s: %s", name, fault.Reason)
	}
	return err
}

// page gives the number of values of a data page, and steps over it.
func (g *guard) page(h *format.PageHeader, codec format.CompressionCodec, r *bufio.Reader, optional bool) (values int64, err error) {
	n, encoding, plain, packed := claims(h)
	declared, stored := int64(h.UncompressedPageSize), int64(h.CompressedPageSize)
	switch {
	case n < 0 || declared < 0 || stored < 0 || plain < 0 || plain > min(declared, stored):
		return 0, unfit("the Parquet file is damaged: a page of impossible size")
	case declared > mostPage || stored > mostPage || n > mostValues:
		return 0, unfit("a page claims %d bytes and %d values, more than the limits of %d and %d", max(declared, stored), n, int64(mostPage), int64(mostValues))
	case !known(encoding):
		return 0, unfit("a page is encoded by %s, which strayd does not read; deliver plain or dictionary pages", encoding)
	}
	if g.total += max(declared, stored); g.total > g.bounds.Bytes || g.total > 1<<20+g.bounds.Ratio*g.size {
		return 0, unfit("the file swells to more than %d bytes or %d times its size, the limits", g.bounds.Bytes, g.bounds.Ratio)
	}
	body := make([]byte, stored)
	if _, err := io.ReadFull(r, body); err != nil {
		return 0, unfit("the Parquet file is cut off within a page")
	}
	data := body[plain:]
	if !packed {
		codec = format.Uncompressed
	}
	if data, err = unpack(codec, data, declared-plain); err != nil {
		return 0, err
	}
	if h.Type == format.DictionaryPage {
		return 0, nil
	}
	if h.Type == format.DataPage && optional {
		data = behindLevels(data)
	}
	return n, checkDeltas(encoding, data, n)
}

// behindLevels is what follows the levels of a page of the first version, which say which cells have a value: their length of four bytes,
// then they (Parquet format, Data Pages).
func behindLevels(data []byte) []byte {
	if len(data) < 4 {
		return nil
	}
	return data[min(int64(len(data)), 4+int64(binary.LittleEndian.Uint32(data))):]
}

// checkDeltas looks at how many values a page says that it holds as differences: sizes of a block and of its parts, then the number
// (Parquet format, Delta encoding).
func checkDeltas(e format.Encoding, data []byte, values int64) error {
	if e != format.DeltaBinaryPacked && e != format.DeltaLengthByteArray {
		return nil
	}
	for range 2 {
		_, n := binary.Uvarint(data)
		if n <= 0 {
			return damagedPage()
		}
		data = data[n:]
	}
	if said, n := binary.Uvarint(data); n <= 0 || said > uint64(values) {
		return damagedPage()
	}
	return nil
}

// claims are what a page's header says: how many values, how they are encoded, and how many bytes in front are not packed.
func claims(h *format.PageHeader) (values int64, encoding format.Encoding, plain int64, packed bool) {
	switch h.Type {
	case format.DictionaryPage:
		return int64(h.DictionaryPageHeader.V.NumValues), h.DictionaryPageHeader.V.Encoding, 0, true
	case format.DataPage:
		return int64(h.DataPageHeader.V.NumValues), h.DataPageHeader.V.Encoding, 0, true
	case format.DataPageV2:
		v := &h.DataPageHeaderV2.V
		return int64(v.NumValues), v.Encoding, int64(v.DefinitionLevelsByteLength) + int64(v.RepetitionLevelsByteLength), !v.IsCompressed.Valid || v.IsCompressed.V
	}
	return -1, 0, 0, false
}

// known are the encodings whose room is bounded by the bytes of the page and its number of values.
func known(e format.Encoding) bool {
	//lint:ignore SA1019 writers of the format's first version still use it
	return slices.Contains([]format.Encoding{format.Plain, format.PlainDictionary, format.RLE, format.RLEDictionary, format.ByteStreamSplit,
		format.DeltaBinaryPacked, format.DeltaLengthByteArray}, e)
}

// unpack unpacks a page, and no more than it claims.
func unpack(codec format.CompressionCodec, body []byte, declared int64) ([]byte, error) {
	var src io.Reader
	var err error
	switch codec {
	case format.Uncompressed:
		src = bytes.NewReader(body)
	case format.Snappy:
		if n, used := binary.Uvarint(body); used <= 0 || n != uint64(declared) { // the size stands in front (snappy format description, section 1)
			return nil, damagedPage()
		}
		var data []byte
		data, err = snappy.Decode(nil, body)
		src = bytes.NewReader(data)
	case format.Gzip:
		src, err = gzip.NewReader(bytes.NewReader(body))
	default:
		var z *zstd.Decoder
		if z, err = zstd.NewReader(bytes.NewReader(body), zstd.WithDecoderConcurrency(1), zstd.WithDecoderMaxMemory(mostPage+1)); err == nil {
			defer z.Close()
		}
		src = z
	}
	if err != nil {
		return nil, damagedPage()
	}
	data, err := io.ReadAll(io.LimitReader(src, declared+1))
	if err != nil || int64(len(data)) != declared {
		return nil, damagedPage()
	}
	return data, nil
}

func damagedPage() error { return unfit("the Parquet file is damaged: a page cannot be unpacked") }

// guarded calls do, and turns a panic of the library, and any error that is no fault of reading, into a fault of the file.
func guarded(do func() error) (err error) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true)) // the library reads some pages by code that no bounds are checked in
	defer func() {
		if r := recover(); r != nil {
			err = unfit("the Parquet file is damaged: %v", r)
		}
	}()
	err = do()
	var fault *watcher.GridFault
	switch {
	case err == nil || err == io.EOF:
		return err
	case errors.As(err, &fault):
		return fault
	case errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, pq.ErrCorrupted):
		return unfit("the Parquet file is damaged or cut off: %v", err)
	}
	return unfit("the Parquet file cannot be read: %v", err)
}

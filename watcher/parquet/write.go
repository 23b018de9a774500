package parquet

import (
	"errors"
	"io"

	pq "github.com/parquet-go/parquet-go"

	"strayd/rules"
	"strayd/watcher"
)

// returnRow and priceRow are the schemas of what is written. Their columns and types are read by other programs: they are added to, never
// changed. Numbers are decimals of 38 digits, so that they are exact; the bytes are big-endian two's complement.
type returnRow struct {
	Date   int32    `parquet:"date,date"`
	Series string   `parquet:"series,dict"`
	Return [16]byte `parquet:"return,decimal(15:38)"`
	Days   int32    `parquet:"days"`
	Status *string  `parquet:"status,optional,dict"`
}

type priceRow struct {
	Date   int32    `parquet:"date,date"`
	Series string   `parquet:"series,dict"`
	Price  [16]byte `parquet:"price,decimal(10:38)"`
}

// groupRows is how many rows a row group has: what is kept in memory while it is written.
const groupRows = 1 << 18

// Writer writes a table of returns or of prices.
type Writer struct {
	returns *pq.GenericWriter[returnRow]
	prices  *pq.GenericWriter[priceRow]
	first   []returnRow
	second  []priceRow
}

// NewWriter begins a table.
func NewWriter(out io.Writer, what watcher.What) *Writer {
	options := []pq.WriterOption{pq.Compression(&pq.Snappy), pq.MaxRowsPerRowGroup(groupRows)}
	if what == watcher.Prices {
		return &Writer{prices: pq.NewGenericWriter[priceRow](out, append(options, pq.KeyValueMetadata("strayd.schema", "prices 1"))...)}
	}
	return &Writer{returns: pq.NewGenericWriter[returnRow](out, append(options, pq.KeyValueMetadata("strayd.schema", "returns 1"))...)}
}

var estimate = "estimate"

// Write adds a value at the places of what is written, with the terms that it came with.
func (w *Writer) Write(date rules.Date, series []byte, value int64, t rules.Terms) error {
	if w.prices != nil {
		w.second = append(w.second, priceRow{int32(date), string(series), wide(value)})
	} else {
		r := returnRow{Date: int32(date), Series: string(series), Return: wide(value), Days: int32(t.Span())}
		if t.Estimate {
			r.Status = &estimate
		}
		w.first = append(w.first, r)
	}
	if len(w.first)+len(w.second) < batch {
		return nil
	}
	return w.flush()
}

func (w *Writer) flush() (err error) {
	if w.prices != nil {
		_, err = w.prices.Write(w.second)
	} else {
		_, err = w.returns.Write(w.first)
	}
	w.first, w.second = w.first[:0], w.second[:0]
	return err
}

// Close ends the table, without which it cannot be read.
func (w *Writer) Close() error {
	err := w.flush()
	if w.prices != nil {
		return errors.Join(err, w.prices.Close())
	}
	return errors.Join(err, w.returns.Close())
}

// wide is v in 16 bytes.
func wide(v int64) (b [16]byte) {
	if v < 0 {
		for i := range 8 {
			b[i] = 0xFF
		}
	}
	for i := range 8 {
		b[15-i] = byte(v >> (8 * i))
	}
	return b
}

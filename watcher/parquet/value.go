package parquet

import (
	"math"
	"math/big"
	"strconv"
	"strings"
	"time"

	pq "github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/format"

	"strayd/rules"
	"strayd/watcher"
)

// leaf turns the values of a column into cells.
type leaf func(pq.Value) watcher.GridCell

// leafOf finds how a column's values are read: by the meaning that the file gives them, else by how they are stored.
func leafOf(c *pq.Column) (leaf, error) {
	if !c.Leaf() || c.Repeated() {
		return nil, unfit("column %q holds lists or records; deliver a flat table", c.Name())
	}
	read := stored(c.Type().Kind())
	if l := c.Type().LogicalType(); l != nil {
		switch t := l.Value.(type) {
		case nil, *format.StringType, *format.EnumType, *format.JsonType, *format.UUIDType:
		case *format.IntType:
			if !t.IsSigned {
				read = unsigned
			}
		case *format.DateType:
			read = func(v pq.Value) watcher.GridCell { return day(int64(v.Int32())) }
		case *format.DecimalType:
			read = decimals(int(t.Scale))
		case *format.TimestampType:
			if t.Unit.Value == nil {
				return nil, unfit("column %q holds times of an unknown unit", c.Name())
			}
			read = moments(t.Unit.Value.Duration())
		default:
			return nil, unfit("column %q holds values of type %s, which strayd does not read; leave it out", c.Name(), l)
		}
	}
	return func(v pq.Value) watcher.GridCell {
		if v.IsNull() {
			return watcher.GridCell{}
		}
		return read(v)
	}, nil
}

// stored reads values by their kind alone.
func stored(k pq.Kind) leaf {
	switch k {
	case pq.Boolean:
		return func(v pq.Value) watcher.GridCell {
			return watcher.GridCell{Text: strings.ToUpper(strconv.FormatBool(v.Boolean()))}
		}
	case pq.Int32:
		return func(v pq.Value) watcher.GridCell { return number(strconv.FormatInt(int64(v.Int32()), 10)) }
	case pq.Int64:
		return func(v pq.Value) watcher.GridCell { return number(strconv.FormatInt(v.Int64(), 10)) }
	case pq.Int96:
		return old
	case pq.Float:
		return func(v pq.Value) watcher.GridCell { return float(float64(v.Float()), 32) }
	case pq.Double:
		return func(v pq.Value) watcher.GridCell { return float(v.Double(), 64) }
	}
	return func(v pq.Value) watcher.GridCell { return watcher.GridCell{Text: string(v.ByteArray())} }
}

func number(text string) watcher.GridCell {
	return watcher.GridCell{Kind: watcher.NumberCell, Text: text}
}

// float is the shortest decimal that reads back as the same number of its width.
func float(v float64, bits int) watcher.GridCell {
	if math.IsInf(v, 0) {
		return watcher.GridCell{Text: strings.Replace(strconv.FormatFloat(v, 'g', -1, 64), "Inf", "Infinity", 1)}
	}
	return number(strconv.FormatFloat(v, 'g', -1, bits))
}

func unsigned(v pq.Value) watcher.GridCell {
	if v.Kind() == pq.Int32 {
		return number(strconv.FormatUint(uint64(v.Uint32()), 10))
	}
	return number(strconv.FormatUint(v.Uint64(), 10))
}

// decimals is unscaled x 10^-scale, exactly. Bytes are big-endian two's complement (Parquet format, LogicalTypes, DECIMAL).
func decimals(scale int) leaf {
	return func(v pq.Value) watcher.GridCell {
		n := new(big.Int)
		switch v.Kind() {
		case pq.Int32:
			n.SetInt64(int64(v.Int32()))
		case pq.Int64:
			n.SetInt64(v.Int64())
		default:
			b := v.ByteArray()
			n.SetBytes(b)
			if len(b) > 0 && b[0] >= 0x80 {
				n.Sub(n, new(big.Int).Lsh(big.NewInt(1), uint(8*len(b))))
			}
		}
		return number(pointed(n, scale))
	}
}

func pointed(n *big.Int, scale int) string {
	digits := new(big.Int).Abs(n).String()
	if pad := scale + 1 - len(digits); pad > 0 {
		digits = strings.Repeat("0", pad) + digits
	}
	at := len(digits) - max(scale, 0)
	text := digits[:at]
	if scale > 0 {
		text += "." + digits[at:]
	}
	if n.Sign() < 0 {
		text = "-" + text
	}
	return text
}

func day(days int64) watcher.GridCell {
	if days < math.MinInt32/2 || days > math.MaxInt32/2 {
		return watcher.GridCell{Text: "day " + strconv.FormatInt(days, 10)}
	}
	return watcher.GridCell{Kind: watcher.DateCell, Date: rules.Date(days)}
}

const dayLength = 24 * time.Hour

// moments reads times since 1970-01-01: midnight is the day, anything else is shown as it is and fits no style of a date.
func moments(unit time.Duration) leaf {
	perDay := int64(dayLength / unit)
	return func(v pq.Value) watcher.GridCell {
		n := v.Int64()
		if n%perDay == 0 {
			return day(n / perDay)
		}
		seconds := int64(time.Second / unit)
		return shown(time.Unix(n/seconds, n%seconds*int64(unit)))
	}
}

func shown(t time.Time) watcher.GridCell {
	return watcher.GridCell{Text: t.UTC().Format("2006-01-02T15:04:05.999999999")}
}

// julianEpoch is the Julian day number of 1970-01-01.
const julianEpoch = 2440588

// old reads the withdrawn type of 96 bits: nanoseconds within the day, then the Julian day (Parquet format, INT96).
func old(v pq.Value) watcher.GridCell {
	n := v.Int96()
	nanos, days := int64(n[1])<<32|int64(n[0]), int64(int32(n[2]))-julianEpoch
	if nanos == 0 {
		return day(days)
	}
	return shown(time.Unix(days*86400, 0).Add(time.Duration(nanos)))
}

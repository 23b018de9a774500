package sample

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"strings"
	"unicode/utf16"
	"unicode/utf8"
)

// most is how much text of a sample is looked at.
const most = 16 << 20

// Text takes the beginning of a file of text apart. The error is *Unreadable, or what went wrong in reading.
func Text(name string, src io.Reader) (*Sample, error) {
	s := &Sample{Name: name}
	if strings.HasSuffix(name, ".gz") {
		z, err := gzip.NewReader(src)
		if err != nil {
			return nil, &Unreadable{name, 0, "is not gzip, though its name says so"}
		}
		src = z
	}
	data, err := io.ReadAll(io.LimitReader(src, most+1))
	switch {
	case errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, gzip.ErrChecksum):
		return nil, &Unreadable{name, 0, "the compressed file is cut off or damaged"}
	case err != nil:
		return nil, err
	}
	if s.Cut = len(data) > most; s.Cut {
		data = data[:most]
	}
	text, err := s.decode(data)
	if err != nil {
		return nil, err
	}
	if s.Cut {
		text = text[:strings.LastIndexByte(text, '\n')+1]
	}
	if strings.TrimSpace(text) == "" {
		return nil, &Unreadable{name, 0, "the file is empty"}
	}
	return s, s.part(text)
}

// decode finds the encoding: a mark at the beginning proves it; else UTF-8 that holds together, which other encodings do not by chance.
func (s *Sample) decode(data []byte) (string, error) {
	for magic, what := range map[string]string{"PK\x03\x04": "a spreadsheet or archive", "PAR1": "a Parquet file", "%PDF": "a PDF",
		"\xD0\xCF\x11\xE0": "a spreadsheet in the old binary format (.xls)", "\x1f\x8b": "a gzip file without .gz in its name"} {
		if bytes.HasPrefix(data, []byte(magic)) {
			return "", &Unreadable{s.Name, 0, "this is " + what + ", not text"}
		}
	}
	s.encoded = Remark{Key: "encoding", Sure: Sure}
	if order, skip := wideOrder(data); order != nil {
		s.Encoding, s.encoded.Why = "utf-16", "the file begins as UTF-16 does"
		return wideText(data[skip:], order), nil
	}
	data = bytes.TrimPrefix(data, []byte("\uFEFF"))
	if bytes.IndexByte(data, 0) >= 0 {
		return "", &Unreadable{s.Name, 0, "holds NUL bytes: this is no text"}
	}
	if utf8.Valid(data) || s.Cut && utf8.Valid(data[:len(data)-utf8.UTFMax]) {
		s.Encoding, s.encoded.Why = "utf-8", "every character holds together as UTF-8"
		return string(data), nil
	}
	return s.latin(data)
}

func (s *Sample) latin(data []byte) (string, error) {
	var b strings.Builder
	line := 1
	for _, c := range data {
		switch {
		case c == '\n':
			line++
		case c >= 0x80 && c < 0xA0:
			return "", &Unreadable{s.Name, line, fmt.Sprintf("byte 0x%X is neither UTF-8 nor latin-1 (it looks like windows-1252); ask for UTF-8", c)}
		}
		b.WriteRune(rune(c))
	}
	s.Encoding = "latin-1"
	s.encoded.Sure, s.encoded.Why, s.encoded.Confirm = Likely, "it is not UTF-8, and every byte is a letter of latin-1; look at names with accents", true
	return b.String(), nil
}

func wideOrder(data []byte) (binary.ByteOrder, int) {
	switch {
	case len(data) < 4:
	case data[0] == 0xFF && data[1] == 0xFE:
		return binary.LittleEndian, 2
	case data[0] == 0xFE && data[1] == 0xFF:
		return binary.BigEndian, 2
	case data[0] != 0 && data[1] == 0 && data[2] != 0 && data[3] == 0:
		return binary.LittleEndian, 0
	case data[0] == 0 && data[1] != 0 && data[2] == 0 && data[3] != 0:
		return binary.BigEndian, 0
	}
	return nil, 0
}

func wideText(data []byte, order binary.ByteOrder) string {
	units := make([]uint16, len(data)/2)
	for i := range units {
		units[i] = order.Uint16(data[2*i:])
	}
	return string(utf16.Decode(units))
}

// separators are what may part cells, in the order in which a draw goes.
var separators = []struct {
	char byte
	name string
}{{',', "comma"}, {';', "semicolon"}, {'\t', "tab"}, {'|', "bar"}}

// probe is how many lines are cut by each separator to choose one.
const probe = 500

// part finds the separator, by which the rows fall into as many cells as the header, and cuts the text by it.
func (s *Sample) part(text string) error {
	if len(text) >= 4 && strings.EqualFold(text[:4], "sep=") {
		return &Unreadable{s.Name, 1, "the file begins with a spreadsheet's separator line; ask for it without"}
	}
	best, even := -1, 0.0
	for i, sep := range separators {
		if share := evenness(text, sep.char); share > even {
			best, even = i, share
		}
	}
	if best < 0 {
		return &Unreadable{s.Name, 1, "no separator (comma, semicolon, tab or bar) parts the lines into cells"}
	}
	s.Separator = separators[best].char
	s.parted = Remark{Key: "separator", Sure: Sure, Why: fmt.Sprintf("the %s parts every line into as many cells", separators[best].name)}
	if even < 1 {
		s.parted.Sure, s.parted.Why = Likely, fmt.Sprintf("the %s parts %.0f %% of the lines into as many cells", separators[best].name, 100*even)
		s.parted.Confirm = true
	}
	rows, err := records(text, s.Separator, 0)
	if err != nil {
		return &Unreadable{s.Name, 0, err.Error()}
	}
	s.Header, s.Line, s.Rows = rows[0].Cells, rows[0].Line, rows[1:]
	return s.checkHeader()
}

// evenness is the share of lines that have as many cells as most have, 0 when that is one.
func evenness(text string, sep byte) float64 {
	rows, err := records(text, sep, probe)
	if err != nil || len(rows) == 0 {
		return 0
	}
	counts := map[int]int{}
	for _, r := range rows {
		counts[len(r.Cells)]++
	}
	mode := 0
	for n, times := range counts {
		if times > counts[mode] || times == counts[mode] && n > mode {
			mode = n
		}
	}
	if mode < 2 {
		return 0
	}
	return float64(counts[mode]) / float64(len(rows))
}

// records cuts text into rows without blank ones and control totals; the first atMost of them, 0 for all.
func records(text string, sep byte, atMost int) (rows []Row, err error) {
	r := csv.NewReader(strings.NewReader(text))
	r.Comma, r.FieldsPerRecord, r.LazyQuotes = rune(sep), -1, true
	for atMost == 0 || len(rows) < atMost {
		cells, err := r.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		line, _ := r.FieldPos(0)
		if strings.TrimSpace(strings.Join(cells, "")) != "" && !strings.HasPrefix(cells[0], "#") {
			rows = append(rows, Row{line, cells})
		}
	}
	return rows, nil
}

// checkHeader wants names in the first row.
func (s *Sample) checkHeader() error {
	for i, name := range s.Header {
		s.Header[i] = strings.TrimSpace(name)
	}
	if len(s.Rows) > 0 && len(s.Header) < len(s.Rows[0].Cells) {
		return &Unreadable{s.Name, s.Line, fmt.Sprintf("the first line has %d cells and the next %d: strayd needs the names of the columns in the first line",
			len(s.Header), len(s.Rows[0].Cells))}
	}
	for _, name := range s.Header {
		if number(name, '.') || number(name, ',') || aDate(name) {
			return &Unreadable{s.Name, s.Line, fmt.Sprintf("the first line holds %q, which is data: strayd needs the names of the columns there", name)}
		}
	}
	return nil
}

// Cells makes a sample of rows that know their cells, such as those of a spreadsheet: the first is the header.
func Cells(name string, rows []Row, cut bool) (*Sample, error) {
	if len(rows) == 0 {
		return nil, &Unreadable{name, 0, "the file is empty"}
	}
	s := &Sample{Name: name, Header: rows[0].Cells, Line: rows[0].Line, Cut: cut, Typed: true}
	for _, r := range rows[1:] {
		if len(r.Cells) == 0 || !strings.HasPrefix(r.Cells[0], "#") { // a control total
			s.Rows = append(s.Rows, r)
		}
	}
	return s, s.checkHeader()
}

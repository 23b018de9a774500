package spreadsheet

import (
	"archive/zip"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"github.com/xuri/excelize/v2"

	"strayd/watcher"
)

// Bounds: the library holds a sheet with some ten times the room of its text, and looks for a cell along its row.
const (
	mostText    = 32 << 20 // bytes of one part, unpacked: some 600,000 cells
	mostParts   = 4096
	mostColumns = 2000
)

// unfit is why the whole file is refused.
func unfit(format string, args ...any) *watcher.GridFault {
	return &watcher.GridFault{Row: -1, Column: -1, Reason: fmt.Sprintf(format, args...)}
}

// Open opens the sheet of that name, or the only visible one.
func Open(file io.ReaderAt, size int64, sheet string, bounds watcher.GridBounds) (watcher.Grid, error) {
	bounds.Bytes, bounds.Columns = min(bounds.Bytes, 4*mostText), min(bounds.Columns, mostColumns)
	if err := checkParts(file, size, bounds); err != nil {
		return nil, err
	}
	g := &grid{styles: map[int]watcher.CellKind{}, columns: bounds.Columns}
	err := guarded(func() (err error) {
		g.book, err = excelize.OpenReader(io.NewSectionReader(file, 0, size),
			excelize.Options{RawCellValue: true, UnzipSizeLimit: bounds.Bytes, UnzipXMLSizeLimit: mostText})
		if err == io.EOF {
			return unfit("the archive holds no workbook")
		}
		if err != nil {
			return err
		}
		if g.sheet, err = choose(g.book, sheet); err != nil {
			return err
		}
		return g.load()
	})
	if err != nil && g.book != nil {
		err = errors.Join(err, g.Close())
	}
	if fault, ok := errors.AsType[*watcher.GridFault](err); ok {
		return nil, fault
	}
	if err != nil {
		return nil, err
	}
	return g, nil
}

// checkParts unpacks every part of the archive once: against its checksum, its own claim and the bounds.
func checkParts(file io.ReaderAt, size int64, bounds watcher.GridBounds) error {
	head := make([]byte, 4)
	if n, err := file.ReadAt(head, 0); err != nil && err != io.EOF {
		return err
	} else if n == 0 {
		return unfit("the file is empty")
	}
	if string(head) == "\xD0\xCF\x11\xE0" {
		return unfit("the workbook is protected by a password, or of the old binary format (.xls); save it as a plain .xlsx")
	}
	archive, err := zip.NewReader(file, size)
	if err != nil {
		return unfit("this is no .xlsx workbook, or it is cut off")
	}
	if len(archive.File) > mostParts {
		return unfit("the workbook has %d parts, more than the limit of %d", len(archive.File), mostParts)
	}
	total := int64(0)
	for _, part := range archive.File {
		n, err := unpacked(part)
		if err != nil {
			return unfit("the workbook is damaged or cut off: its part %q cannot be unpacked", part.Name)
		}
		switch total += n; {
		case n > mostText:
			return unfit("the workbook's part %q is larger than %d bytes, the limit; deliver CSV or Parquet", part.Name, int64(mostText))
		case total > bounds.Bytes:
			return unfit("the workbook swells to more than %d bytes, the limit; deliver CSV or Parquet", bounds.Bytes)
		case total > 1<<20+bounds.Ratio*size:
			return unfit("the workbook swells to more than %d times its size, the limit", bounds.Ratio)
		}
	}
	return nil
}

// unpacked counts the bytes of a part, up to one over the limit.
func unpacked(part *zip.File) (int64, error) {
	r, err := part.Open()
	if err != nil {
		return 0, err
	}
	n, err := io.Copy(io.Discard, io.LimitReader(r, mostText+1))
	return n, errors.Join(err, r.Close())
}

// choose finds the sheet to be read.
func choose(book *excelize.File, name string) (string, error) {
	all := book.GetSheetList()
	var visible []string
	for _, s := range all {
		shown, err := book.GetSheetVisible(s)
		if err != nil {
			return "", err
		}
		if shown {
			visible = append(visible, s)
		}
	}
	switch {
	case name != "" && slices.Contains(all, name):
		return name, nil
	case name != "":
		return "", unfit("the workbook has no sheet %q; it has %s", name, quoted(all))
	case len(visible) == 1:
		return visible[0], nil
	}
	return "", unfit("the workbook has the visible sheets %s; say in the feed which one is meant, as in sheet: NAME", quoted(visible))
}

func quoted(names []string) string {
	texts := make([]string, 0, len(names))
	for _, n := range names[:min(len(names), 20)] {
		texts = append(texts, fmt.Sprintf("%q", n))
	}
	if len(texts) == 0 {
		return "(none)"
	}
	return strings.Join(texts, ", ")
}

// guarded turns a panic of the library and its errors into a fault of the file.
func guarded(do func() error) (err error) {
	defer func() {
		if r := recover(); r != nil {
			err = unfit("the workbook is damaged: %v", r)
		}
	}()
	err = do()
	if _, ok := errors.AsType[*watcher.GridFault](err); ok || err == nil || err == io.EOF {
		return err
	}
	return unfit("the workbook cannot be read: %v", err)
}

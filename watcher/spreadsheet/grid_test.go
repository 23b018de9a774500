package spreadsheet

import (
	"archive/zip"
	"bytes"
	"fmt"
	"io"
	"maps"
	"slices"
	"strings"
	"testing"

	"strayd/watcher"
)

// parts is a workbook written out by hand, so that what is read is not what the library wrote. (ECMA-376, part 1, 18.2 to 18.8.)
func parts(sheet string) map[string]string {
	const main = `xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"`
	const rels = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
	return map[string]string{
		"[Content_Types].xml": `<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"><Default Extension="rels" ` +
			`ContentType="application/vnd.openxmlformats-package.relationships+xml"/><Default Extension="xml" ContentType="application/xml"/>` +
			`<Override PartName="/xl/workbook.xml" ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/></Types>`,
		"_rels/.rels": `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="rId1" Type="` + rels +
			`/officeDocument" Target="xl/workbook.xml"/></Relationships>`,
		"xl/workbook.xml": `<workbook ` + main + ` xmlns:r="` + rels + `"><workbookPr/><sheets><sheet name="Returns" sheetId="1" r:id="rId1"/></sheets></workbook>`,
		"xl/_rels/workbook.xml.rels": `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="rId1" Type="` +
			rels + `/worksheet" Target="worksheets/sheet1.xml"/><Relationship Id="rId2" Type="` + rels + `/styles" Target="styles.xml"/><Relationship Id="rId3" Type="` +
			rels + `/sharedStrings" Target="sharedStrings.xml"/></Relationships>`,
		"xl/styles.xml": `<styleSheet ` + main + `><numFmts count="3"><numFmt numFmtId="164" formatCode="dd/mm/yyyy;@"/><numFmt numFmtId="165" formatCode="0.0000%"/>` +
			`<numFmt numFmtId="166" formatCode="[Red]0.00&quot; days&quot;"/></numFmts><cellXfs count="6"><xf numFmtId="0"/><xf numFmtId="14"/><xf numFmtId="10"/>` +
			`<xf numFmtId="164"/><xf numFmtId="165"/><xf numFmtId="166"/></cellXfs></styleSheet>`,
		"xl/sharedStrings.xml":     `<sst ` + main + ` count="2" uniqueCount="2"><si><t>alder</t></si><si><r><t>bir</t></r><r><t>ch</t></r></si></sst>`,
		"xl/worksheets/sheet1.xml": `<worksheet ` + main + `>` + sheet + `</worksheet>`,
	}
}

func pack(t testing.TB, parts map[string]string) []byte {
	t.Helper()
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	for _, name := range slices.Sorted(maps.Keys(parts)) {
		w, err := z.Create(name)
		if err == nil {
			_, err = io.WriteString(w, parts[name])
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func open(content []byte, sheet string) (watcher.Grid, error) {
	return Open(bytes.NewReader(content), int64(len(content)), sheet, watcher.GridBounds{Bytes: 8 << 30, Ratio: 200, Columns: 1024})
}

// spelled is every cell of a grid: its place, kind and value; or why it is refused.
func spelled(content []byte, sheet string) string {
	g, err := open(content, sheet)
	if err != nil {
		return err.Error()
	}
	defer g.Close() //nolint:errcheck // only read
	var b strings.Builder
	for {
		cells, row, err := g.Next()
		if err == io.EOF {
			for _, n := range g.Notes() {
				b.WriteString(n + "\n")
			}
			return strings.TrimSpace(b.String())
		}
		if f, ok := err.(*watcher.GridFault); ok {
			return fmt.Sprintf("%s%s: %s %s", b.String(), g.Place(f.Row, f.Column), f.Reason, f.Cell)
		} else if err != nil {
			return err.Error()
		}
		for i, c := range cells {
			switch {
			case c.Kind == watcher.DateCell:
				fmt.Fprintf(&b, "%s date %s\n", g.Place(row, i), c.Date)
			case c.Text != "":
				fmt.Fprintf(&b, "%s %s %s\n", g.Place(row, i), [...]string{"text", "number", "percent"}[c.Kind], c.Text)
			}
		}
	}
}

// What each cell is taken for. Serial day 46090 is Monday 9 March 2026 (45292 is 1 January 2024, and 798 days follow).
func TestCells(t *testing.T) {
	check := func(what, rows, want string) {
		t.Helper()
		if got := spelled(pack(t, parts("<sheetData>"+rows+"</sheetData>")), ""); got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", what, got, want)
		}
	}
	check("texts", `<row r="1"><c r="A1" t="s"><v>0</v></c><c r="B1" t="s"><v>1</v></c><c r="D1" t="inlineStr"><is><t>cedar</t></is></c></row>`,
		"Returns!A1 text alder\nReturns!B1 text birch\nReturns!D1 text cedar")
	check("numbers keep their digits", `<row r="2"><c r="A2"><v>0.012300000000000001</v></c><c r="B2" t="n"><v>-1E-5</v></c><c r="C2" s="5"><v>7</v></c></row>`,
		"Returns!A2 number 0.012300000000000001\nReturns!B2 number -1E-5\nReturns!C2 number 7")
	check("days", `<row r="1"><c r="A1" s="1"><v>46090</v></c><c r="B1" s="3"><v>46090</v></c><c r="C1" t="d"><v>2026-03-09</v></c><c r="D1" t="d"><v>2026-03-09T00:00:00</v></c></row>`,
		"Returns!A1 date 2026-03-09\nReturns!B1 date 2026-03-09\nReturns!C1 date 2026-03-09\nReturns!D1 date 2026-03-09")
	check("a day with a time is no day", `<row r="1"><c r="A1" s="1"><v>46090.75</v></c><c r="B1" s="1"><v>60</v></c><c r="C1" s="1"><v>-1</v></c></row>`,
		"Returns!A1 text 2026-03-09T18:00:00\nReturns!B1 text 1900-02-28T00:00:00\nReturns!C1 text serial day -1")
	check("per cent", `<row r="1"><c r="A1" s="2"><v>0.0123</v></c><c r="B1" s="4"><v>0.0123</v></c></row>`, "Returns!A1 percent 0.0123\nReturns!B1 percent 0.0123")
	check("truth and errors", `<row r="1"><c r="A1" t="b"><v>1</v></c><c r="B1" t="e"><v>#DIV/0!</v></c></row>`, "Returns!A1 text TRUE\nReturns!B1 text #DIV/0!")
	check("formulas", `<row r="1"><c r="A1"><f>1/8</f><v>0.125</v></c><c r="B1" t="str"><f>"x"</f><v>x</v></c><c r="C1" t="str"><f>""</f><v></v></c></row>`,
		"Returns!A1 number 0.125\nReturns!B1 text x")
	check("a formula that nobody computed", `<row r="3"><c r="A3"><v>1</v></c><c r="B3"><f>A3/8</f></c></row>`,
		"Returns!B3: the cell holds a formula without its value; open the workbook in a spreadsheet program and save it, or deliver values =A3/8")
	check("rows keep their numbers", `<row r="2"><c r="A2"><v>1</v></c></row><row r="3"/><row r="9" hidden="1"><c r="C9"><v>2</v></c></row>`,
		"Returns!A2 number 1\nReturns!C9 number 2\nsheet \"Returns\" has 1 row hidden and read like any other")
	check("a text that is not in the list", `<row r="1"><c r="A1"><v>1</v></c><c r="B1"><v>1</v></c></row><row r="2"><c r="A2"><v>1</v></c><c r="B2" t="s"><v>7</v></c></row>`,
		"Returns!A1 number 1\nReturns!B1 number 1\nReturns: the workbook cannot be read: invalid shared string index 7 ")
	check("a sheet that breaks off", `<row r="1"><c r="A1"><v>1</v></c></row><row r="2"><c r="A2"><v>2`,
		"the workbook cannot be read: XML syntax error on line 1: element <v> closed by </sheetData>")
	check("nothing", "", "")
}

func TestWorkbooks(t *testing.T) {
	const rows = `<sheetData><row r="1"><c r="A1" s="1"><v>44628</v></c><c r="B1"><v>1</v></c></row></sheetData>`
	check := func(what string, change func(p map[string]string), sheet, want string) {
		t.Helper()
		p := parts(rows)
		change(p)
		if got := spelled(pack(t, p), sheet); got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", what, got, want)
		}
	}
	replace := func(part, old, fresh string) func(map[string]string) {
		return func(p map[string]string) { p[part] = strings.Replace(p[part], old, fresh, 1) }
	}
	// 44628 + 1462 = 46090.
	check("days from 1904", replace("xl/workbook.xml", "<workbookPr/>", `<workbookPr date1904="1"/>`), "", "Returns!A1 date 2026-03-09\nReturns!B1 number 1")
	check("merged and hidden", func(p map[string]string) {
		replace("xl/worksheets/sheet1.xml", "</sheetData>", `</sheetData><mergeCells count="1"><mergeCell ref="B1:C1"/></mergeCells>`)(p)
		replace("xl/worksheets/sheet1.xml", "<sheetData>", `<cols><col min="2" max="2" hidden="1"/></cols><sheetData>`)(p)
	}, "", "Returns!A1 date 2022-03-08\nReturns!B1 number 1\nsheet \"Returns\" has 1 merged range of which only the first cell has a value\n"+
		"sheet \"Returns\" has 1 column hidden and read like any other")
	check("the sheet by its name", func(map[string]string) {}, "Returns", "Returns!A1 date 2022-03-08\nReturns!B1 number 1")
	check("no such sheet", func(map[string]string) {}, "returns", `the workbook has no sheet "returns"; it has "Returns"`)
	second := replace("xl/workbook.xml", "</sheets>", `<sheet name="Notes" sheetId="2" r:id="rId1"/></sheets>`)
	check("two sheets", second, "", `the workbook has the visible sheets "Returns", "Notes"; say in the feed which one is meant, as in sheet: NAME`)
	check("the other is hidden", func(p map[string]string) {
		second(p)
		replace("xl/workbook.xml", `name="Notes"`, `name="Notes" state="hidden"`)(p)
	}, "", "Returns!A1 date 2022-03-08\nReturns!B1 number 1")
	check("a part that swells", func(p map[string]string) { p["xl/media/a.xml"] = strings.Repeat(" ", 8<<20) }, "",
		"the workbook swells to more than 200 times its size, the limit")
	check("a part that is too large", func(p map[string]string) { p["xl/media/a.xml"] = strings.Repeat("0123456789abcdef", mostText/16+1) }, "",
		`the workbook's part "xl/media/a.xml" is larger than 33554432 bytes, the limit; deliver CSV or Parquet`)
}

// What is no workbook says so.
func TestNoWorkbook(t *testing.T) {
	good := pack(t, parts("<sheetData/>"))
	for _, c := range []struct {
		content []byte
		want    string
	}{
		{nil, "the file is empty"},
		{[]byte("date,series,return\n"), "this is no .xlsx workbook, or it is cut off"},
		{[]byte("\xD0\xCF\x11\xE0 old"), "the workbook is protected by a password, or of the old binary format (.xls); save it as a plain .xlsx"},
		{good[:len(good)/2], "this is no .xlsx workbook, or it is cut off"},
		{good[:len(good)-1], "this is no .xlsx workbook, or it is cut off"},
		{pack(t, map[string]string{"a.txt": "hello"}), "the archive holds no workbook"},
	} {
		if got := spelled(c.content, ""); got != c.want {
			t.Errorf("%.20q: got %s\nwant %s", c.content, got, c.want)
		}
	}
	bad := bytes.Clone(good)
	bad[bytes.Index(bad, []byte("xl/worksheets/sheet1.xml"))+40] ^= 0x55
	if got := spelled(bad, ""); !strings.Contains(got, "cannot be unpacked") && !strings.Contains(got, "cut off") {
		t.Errorf("a flipped byte: %s", got)
	}
}

// FuzzOpen: whatever stands in a sheet or an archive, it is read or refused with a reason, in the same way each time.
func FuzzOpen(f *testing.F) {
	f.Add([]byte(`<sheetData><row r="1"><c r="A1" s="1"><v>46090</v></c><c r="B1" t="s"><v>1</v></c></row></sheetData>`), true)
	f.Add([]byte(`<sheetData><row r="1048577"><c r="XFE1"><f>1</f></c></row></sheetData><mergeCells><mergeCell ref="A1:B"/></mergeCells>`), true)
	f.Add(pack(f, parts("<sheetData/>")), false)
	f.Fuzz(func(t *testing.T, content []byte, inside bool) {
		if inside {
			content = pack(t, parts(string(content)))
		}
		if one, two := spelled(content, ""), spelled(content, ""); one != two {
			t.Fatalf("first\n%s\nthen\n%s", one, two)
		}
	})
}

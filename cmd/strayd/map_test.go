package main

import (
	"bytes"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path"
	"slices"
	"strconv"
	"strings"
	"testing"
	"testing/fstest"
)

// The map of rooms. Imports run
//
//	cmd -> {config, watcher/*, notify/*} -> {watcher, notify} -> rules/* -> rules -> stats
//
// and never back; siblings do not meet, and each third-party package has one door.

// topFolders are the folders that may be at the top, beside those whose names begin with a dot.
var topFolders = []string{"cmd", "config", "notify", "rules", "stats", "testdata", "watcher"}

// mayImport says which rooms of the project a room may import. A room is a folder's path; "watcher/*" is any child of watcher.
// cmd is not in the list: it sees every room.
var mayImport = map[string][]string{
	"stats":     nil,
	"rules":     {"stats"},
	"rules/*":   {"rules", "stats"},
	"watcher":   {"rules", "rules/*", "stats"},
	"notify":    {"rules", "rules/*", "stats"},
	"config":    {"rules", "rules/*", "stats"},
	"watcher/*": {"watcher", "rules", "rules/*", "stats"},
	"notify/*":  {"notify", "rules", "rules/*", "stats"},
}

// doors says where a third-party package may be imported.
var doors = []struct {
	module string
	rooms  []string
}{
	{"gonum.org/v1/gonum", []string{"stats"}},
	{"gonum.org/v1/plot", []string{"notify/chart"}},
	{"go.etcd.io/bbolt", []string{"watcher/ledger"}},
	{"github.com/parquet-go/parquet-go", []string{"watcher/parquet"}},
	{"github.com/xuri/excelize", []string{"watcher/spreadsheet"}},
	{"github.com/klauspost/compress", []string{"watcher/parquet"}},
	{"github.com/robfig/cron", []string{"watcher/schedule"}},
	{"github.com/rickar/cal", []string{"watcher/calendar"}},
	{"github.com/slack-go/slack", []string{"notify/slack"}},
	{"github.com/wneessen/go-mail", []string{"notify/mail"}},
	{"gopkg.in/yaml.v3", []string{"config"}},
	{"github.com/spf13/cobra", []string{"cmd/*"}},
	{"github.com/spf13/pflag", []string{"cmd/*"}},
	{"github.com/schollz/progressbar", []string{"cmd/*"}},
	{"golang.org/x/term", []string{"cmd/*"}},
	{"golang.org/x/sys", []string{"cmd/*", "watcher/*"}},
	{"golang.org/x/text", []string{"cmd/*", "watcher/*", "notify/*", "config"}},
}

// onlyInTests are packages that no program is built from.
var onlyInTests = []string{"github.com/chromedp/chromedp", "github.com/chromedp/cdproto", "github.com/rogpeppe/go-internal", "github.com/santhosh-tekuri/jsonschema", "pgregory.net/rapid", "testing"}

// madeInTests are packages with which tests of the whole program make files for it to read.
var madeInTests = []string{"github.com/parquet-go/parquet-go", "github.com/xuri/excelize"}

// pure are the rooms without file, socket and clock, and what stands for these.
var (
	pure      = []string{"rules", "stats"}
	effectful = []string{"os", "net", "syscall", "io/fs", "path/filepath", "os/exec", "net/http"}
)

func TestRoomsKeepToTheMap(t *testing.T) {
	found, files, err := violations(os.DirFS("../.."))
	if err != nil {
		t.Fatal(err)
	}
	if files < 100 {
		t.Errorf("%d Go files looked at: the test does not see the project", files)
	}
	for _, v := range found {
		t.Error(v)
	}
}

// Each snippet breaks one rule, and the test says which.
func TestMapFindsViolations(t *testing.T) {
	const doc = "// Package x is a room.\n"
	imports := func(p string) string { return doc + "package x\n\nimport _ " + strconv.Quote(p) + "\n" }
	for _, c := range []struct{ file, source, want string }{
		{"main.go", doc + "package x\n", "main.go: no Go file at the top"},
		{"util/x.go", doc + "package x\n", "util: no such folder at the top"},
		{"stats/x.go", imports("strayd/rules"), "stats/x.go: stats may not import strayd/rules"},
		{"stats/x_test.go", imports("strayd/rules"), "stats/x_test.go: stats may not import strayd/rules"},
		{"rules/x.go", imports("strayd/watcher"), "rules/x.go: rules may not import strayd/watcher"},
		{"watcher/x.go", imports("strayd/watcher/feed"), "watcher/x.go: watcher may not import strayd/watcher/feed"},
		{"watcher/x.go", imports("strayd/config"), "watcher/x.go: watcher may not import strayd/config"},
		{"watcher/feed/x.go", imports("strayd/watcher/ledger"), "watcher/feed/x.go: watcher/feed may not import strayd/watcher/ledger"},
		{"watcher/feed/x.go", imports("strayd/notify"), "watcher/feed/x.go: watcher/feed may not import strayd/notify"},
		{"notify/slack/x.go", imports("strayd/watcher"), "notify/slack/x.go: notify/slack may not import strayd/watcher"},
		{"config/x.go", imports("strayd/watcher/schedule"), "config/x.go: config may not import strayd/watcher/schedule"},
		{"watcher/feed/deep/x.go", imports("strayd/rules"), "watcher/feed/deep: no such room"},
		{"rules/x.go", imports("gonum.org/v1/gonum/stat"), "rules/x.go: gonum.org/v1/gonum/stat has its door elsewhere, in stats"},
		{"rules/x.go", imports("golang.org/x/text/width"), "rules/x.go: golang.org/x/text/width has its door elsewhere, in cmd/* watcher/* notify/* config"},
		{"watcher/x.go", imports("golang.org/x/sys/unix"), "watcher/x.go: golang.org/x/sys/unix has its door elsewhere, in cmd/* watcher/*"},
		{"watcher/feed/x.go", imports("go.etcd.io/bbolt"), "watcher/feed/x.go: go.etcd.io/bbolt has its door elsewhere, in watcher/ledger"},
		{"cmd/strayd/x.go", imports("github.com/robfig/cron/v3"), "cmd/strayd/x.go: github.com/robfig/cron/v3 has its door elsewhere, in watcher/schedule"},
		{"cmd/strayd/x.go", imports("gopkg.in/yaml.v3"), "cmd/strayd/x.go: gopkg.in/yaml.v3 has its door elsewhere, in config"},
		{"notify/slack/x.go", imports("github.com/wneessen/go-mail"), "notify/slack/x.go: github.com/wneessen/go-mail has its door elsewhere, in notify/mail"},
		{"config/x.go", imports("github.com/spf13/cobra"), "config/x.go: github.com/spf13/cobra has its door elsewhere, in cmd/*"},
		{"config/x.go", imports("example.org/new"), "config/x.go: example.org/new has no door"},
		{"config/x.go", imports("pgregory.net/rapid"), "config/x.go: pgregory.net/rapid is for tests only"},
		{"rules/x.go", imports("os"), "rules/x.go: rules has no file, socket or clock, and imports os"},
		{"rules/x.go", doc + "package x\n\nimport \"time\"\n\nvar Now = time.Now()\n", "rules/x.go: rules has no file, socket or clock, and calls time.Now"},
		{"config/x.go", doc + "package x\n\nfunc init() {}\n", "config/x.go: init functions are not used"},
		{"config/x.go", "package x\n", "config: no package comment"},
		{"cmd/strayd/main.go", doc + "package x\n" + strings.Repeat("\n", 20), "cmd/strayd/main.go: 22 lines, want under 20"},
	} {
		tree := fstest.MapFS{c.file: {Data: []byte(c.source)}}
		if strings.HasSuffix(c.file, "_test.go") {
			tree[path.Dir(c.file)+"/doc.go"] = &fstest.MapFile{Data: []byte(doc + "package x\n")}
		}
		found, _, err := violations(tree)
		if err != nil {
			t.Fatal(err)
		}
		if len(found) != 1 || found[0] != c.want {
			t.Errorf("%s: found %q, want %q", c.file, found, c.want)
		}
	}
}

// mapped is one look over the project.
type mapped struct {
	found    []string
	files    int
	packages map[string]bool // by folder: whether it has a package comment
}

func (m *mapped) say(format string, args ...any) {
	m.found = append(m.found, fmt.Sprintf(format, args...))
}

// violations reads every Go file of the tree and says what breaks the map.
func violations(tree fs.FS) (found []string, files int, err error) {
	ignored, _ := fs.ReadFile(tree, ".gitignore")
	m := &mapped{packages: map[string]bool{}}
	err = fs.WalkDir(tree, ".", func(name string, d fs.DirEntry, err error) error {
		switch {
		case err != nil:
			return err
		case d.IsDir():
			return m.folder(name, string(ignored))
		case path.Ext(name) == ".go":
			return m.file(tree, name)
		}
		return nil
	})
	for folder, documented := range m.packages {
		if !documented {
			m.say("%s: no package comment", folder)
		}
	}
	slices.Sort(m.found)
	return m.found, m.files, err
}

func (m *mapped) folder(name, ignored string) error {
	switch base := path.Base(name); {
	case name == ".":
	case base == "testdata", base[0] == '.', strings.Contains("\n"+ignored, "\n/"+name+"/\n"):
		return fs.SkipDir
	case !strings.Contains(name, "/") && !slices.Contains(topFolders, name):
		m.say("%s: no such folder at the top", name)
		return fs.SkipDir
	case strings.Count(name, "/") > 1:
		m.say("%s: no such room", name)
		return fs.SkipDir
	}
	return nil
}

func (m *mapped) file(tree fs.FS, name string) error {
	m.files++
	source, err := fs.ReadFile(tree, name)
	if err != nil {
		return err
	}
	f, err := parser.ParseFile(token.NewFileSet(), name, source, parser.ParseComments)
	if err != nil {
		return err
	}
	room := path.Dir(name)
	if room == "." {
		m.say("%s: no Go file at the top", name)
		return nil
	}
	test := strings.HasSuffix(name, "_test.go")
	if !test {
		m.packages[room] = m.packages[room] || f.Doc.Text() != ""
		m.code(room, name, f)
	}
	for _, spec := range f.Imports {
		if p, err := strconv.Unquote(spec.Path.Value); err == nil {
			m.imported(room, name, p, test)
		}
	}
	if n := bytes.Count(source, []byte("\n")); name == "cmd/strayd/main.go" && n >= 20 {
		m.say("%s: %d lines, want under 20", name, n)
	}
	return nil
}

// code looks for what a room's own code must not do.
func (m *mapped) code(room, name string, f *ast.File) {
	for _, d := range f.Decls {
		if fn, ok := d.(*ast.FuncDecl); ok && fn.Recv == nil && fn.Name.Name == "init" {
			m.say("%s: init functions are not used", name)
		}
	}
	if !slices.Contains(pure, room) {
		return
	}
	ast.Inspect(f, func(n ast.Node) bool {
		if s, ok := n.(*ast.SelectorExpr); ok && s.Sel.Name == "Now" {
			if x, ok := s.X.(*ast.Ident); ok && x.Name == "time" {
				m.say("%s: %s has no file, socket or clock, and calls time.Now", name, room)
			}
		}
		return true
	})
}

func (m *mapped) imported(room, name, imported string, test bool) {
	first, _, _ := strings.Cut(imported, "/")
	switch {
	case first == "strayd":
		if !roomIn(room, []string{"cmd/*"}) && !roomIn(strings.TrimPrefix(imported, "strayd/"), rightsOf(room)) && imported != "strayd/"+room {
			m.say("%s: %s may not import %s", name, room, imported)
		}
	case !test && within(imported, onlyInTests):
		m.say("%s: %s is for tests only", name, imported)
	case strings.Contains(first, "."):
		if !test || !within(imported, onlyInTests) && !(roomIn(room, []string{"cmd/*"}) && within(imported, madeInTests)) {
			m.thirdParty(room, name, imported)
		}
	case !test && slices.Contains(pure, room) && slices.Contains(effectful, imported):
		m.say("%s: %s has no file, socket or clock, and imports %s", name, room, imported)
	}
}

func (m *mapped) thirdParty(room, name, imported string) {
	for _, d := range doors {
		if !within(imported, []string{d.module}) {
			continue
		}
		if !roomIn(room, d.rooms) {
			m.say("%s: %s has its door elsewhere, in %s", name, imported, strings.Join(d.rooms, " "))
		}
		return
	}
	m.say("%s: %s has no door", name, imported)
}

// within says whether a package is one of the modules, or lies in one.
func within(imported string, modules []string) bool {
	return slices.ContainsFunc(modules, func(module string) bool { return imported == module || strings.HasPrefix(imported, module+"/") })
}

// roomIn says whether a room is one of those listed, by name or as a child.
func roomIn(room string, rooms []string) bool {
	return slices.Contains(rooms, room) || slices.Contains(rooms, path.Dir(room)+"/*")
}

func rightsOf(room string) []string {
	if rooms, ok := mayImport[room]; ok {
		return rooms
	}
	return mayImport[path.Dir(room)+"/*"]
}

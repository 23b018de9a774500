package main

import (
	"bytes"
	"context"
	"flag"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"strayd/watcher/desk"
)

var update = flag.Bool("update", false, "write the real output into the README's console blocks")

// The README's console blocks are run in their order, the demo beside the folder of the rest, and each shows
// what a person would see.
func TestReadmeShowsRealOutput(t *testing.T) {
	text := readme(t)
	root := t.TempDir()
	if err := os.Mkdir(filepath.Join(root, "book"), 0o755); err != nil {
		t.Fatal(err)
	}
	t.Chdir(filepath.Join(root, "book"))
	yaml := fenced(text, "yaml")
	if len(yaml) != 1 {
		t.Fatalf("README has %d YAML blocks, want the one configuration", len(yaml))
	}
	if err := os.WriteFile("strayd.yaml", []byte(yaml[0]), 0o644); err != nil {
		t.Fatal(err)
	}
	blocks := fenced(text, "console")
	if len(blocks) < 5 {
		t.Fatalf("README has %d console blocks", len(blocks))
	}
	for _, block := range blocks {
		real := console(t, root, block)
		if *update {
			text = strings.Replace(text, "```console\n"+block+"```", "```console\n"+real+"```", 1)
			continue
		}
		if got, want := squeeze(block), squeeze(real); got != want {
			t.Errorf("README shows\n%s\nand the program prints\n%s\n(go test ./cmd/strayd -run Readme -update writes it)", got, want)
		}
	}
	if *update {
		if err := os.WriteFile(readmePath, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// readmePath is absolute, since tests change their folder.
var readmePath, _ = filepath.Abs("../../README.md")

func readme(t *testing.T) string {
	t.Helper()
	text, err := os.ReadFile(readmePath)
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// fenced gives the contents of all blocks of a kind.
func fenced(text, kind string) (blocks []string) {
	for _, m := range regexp.MustCompile("(?s)```"+kind+"\n(.*?)```").FindAllStringSubmatch(text, -1) {
		blocks = append(blocks, m[1])
	}
	return blocks
}

// console carries out the commands of a block and gives the block as it should read.
func console(t *testing.T, root, block string) string {
	t.Helper()
	var out bytes.Buffer
	for _, line := range strings.Split(block, "\n") {
		command, ok := strings.CutPrefix(line, "$ ")
		if !ok {
			continue
		}
		fmt.Fprintln(&out, line)
		carryOut(t, root, shellWords(strings.Replace(command, "go run ./cmd/strayd ", "strayd ", 1)), &out)
	}
	text := strings.ReplaceAll(out.String(), root, "/data")
	return anyone(text)
}

// anyone writes a user's name in the place of whoever runs the test, and leaves out what only root is told.
func anyone(text string) string {
	for _, only := range []string{"note: made as root, so that only root may read it\n",
		"note: done as root, which the record says: it may be anybody who has that right\n"} {
		text = strings.ReplaceAll(text, only, "")
	}
	text = strings.ReplaceAll(text, "), as root", ")")
	return strings.ReplaceAll(text, desk.PersonOf(os.Getuid()).String(), "ada (uid 1001)")
}

// shellWords splits a command line at its blanks; double quotes hold words together.
func shellWords(command string) []string {
	words := regexp.MustCompile(`"[^"]*"|\S+`).FindAllString(command, -1)
	for i, w := range words {
		words[i] = strings.Trim(w, `"`)
	}
	return words
}

func carryOut(t *testing.T, root string, words []string, out io.Writer) {
	t.Helper()
	var err error
	switch {
	case words[0] == "mkdir":
		err = os.Mkdir(words[1], 0o755)
	case words[0] == "cp":
		err = copyInto(words[len(words)-1], words[1:len(words)-1])
	case words[0] != "strayd":
		t.Fatalf("README has a command that the test does not know: %q", words)
	case words[1] == "demo" || strings.HasPrefix(strings.Join(words, " "), "strayd --config strayd-demo/"):
		var here string
		if here, err = os.Getwd(); err == nil {
			t.Chdir(root)
			run(context.Background(), words[1:], out, out)
			t.Chdir(here)
		}
	default:
		run(context.Background(), words[1:], out, out)
	}
	if err != nil {
		t.Fatalf("%q: %v", words, err)
	}
}

func copyInto(folder string, files []string) error {
	for _, name := range files {
		content, err := os.ReadFile(name)
		if err != nil {
			return err
		}
		if err := os.WriteFile(filepath.Join(folder, filepath.Base(name)), content, 0o644); err != nil {
			return err
		}
	}
	return nil
}

// squeeze makes every run of blanks one, and hides the hash of the record, which depends on who runs the test.
func squeeze(s string) string {
	var lines []string
	for _, line := range strings.Split(s, "\n") {
		if line = strings.Join(strings.Fields(line), " "); line != "" {
			lines = append(lines, line)
		}
	}
	return regexp.MustCompile(`[0-9a-f]{64}`).ReplaceAllString(strings.Join(lines, "\n"), "HASH")
}

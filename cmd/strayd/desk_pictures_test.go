package main

import (
	"bytes"
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/chromedp/chromedp"

	"strayd/rules"
)

// The pictures of README.md, of the demo's book on its last evening: STRAYD_PICTURES=testdata/pictures go test -run DeskPictures ./cmd/strayd
func TestDeskPictures(t *testing.T) {
	folder := os.Getenv("STRAYD_PICTURES")
	if folder == "" {
		t.Skip("STRAYD_PICTURES does not say where the pictures go, below the project's folder")
	}
	folder, err := filepath.Abs(filepath.Join("../..", folder))
	if err != nil {
		t.Fatal(err)
	}
	chromium := browser(t)
	f := demoFolder(t)
	text := strings.Replace(demoConfig, "{name: equity}", `{name: equity, owner: desk-one, release: {at: "11:00", days: 1}, four_eyes: true}`, 1)
	text = strings.Replace(text, "{name: bond}", `{name: bond, owner: desk-two, release: {at: "09:30", days: 1}}`, 1)
	f.write("strayd.yaml", text)
	b := f.beside()
	b.d.desk.now = func() time.Time { return time.Date(2026, 3, 13, 18, 40, 0, 0, time.UTC) }
	w := newWindow(t, chromium)
	w.open(b.link(rules.Person{UID: 1001, Name: "ada"}), "The desk of ada")
	w.press("button.main", "17 flags")
	root := ask(w, chromedp.Location())
	_, week := b.as(t.Context(), rules.Person{UID: 1001, Name: "ada"}, "weekly", "2026-W11", "--format", "html")
	log := filepath.Join(t.TempDir(), "week.html")
	if err := os.WriteFile(log, []byte(week), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, p := range []struct {
		name, address string
		width, height int64
	}{
		{"today", root, 1180, 760},
		{"flag", root + "flag?ref=27", 1180, 760},
		{"week", "file://" + log, 1000, 760},
	} {
		w.do(chromedp.EmulateViewport(p.width, p.height), chromedp.Navigate(p.address))
		picture := fewColours(t, ask(w, chromedp.CaptureScreenshot()))
		if len(picture) > 120_000 {
			t.Errorf("%s has %d bytes", p.name, len(picture))
		}
		if err := os.WriteFile(filepath.Join(folder, "desk-"+p.name+".png"), picture, 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// fewColours is a picture with its 256 most frequent colours alone: half the bytes, and nobody sees it.
func fewColours(t *testing.T, picture []byte) []byte {
	t.Helper()
	full, err := png.Decode(bytes.NewReader(picture))
	if err != nil {
		t.Fatal(err)
	}
	counts := map[color.Color]int{}
	for y := range full.Bounds().Dy() {
		for x := range full.Bounds().Dx() {
			counts[full.At(x, y)]++
		}
	}
	colours := slices.Collect(maps.Keys(counts))
	slices.SortFunc(colours, func(a, b color.Color) int { return counts[b] - counts[a] })
	few := image.NewPaletted(full.Bounds(), colours[:min(len(colours), 256)])
	draw.Draw(few, few.Bounds(), full, image.Point{}, draw.Src)
	var out bytes.Buffer
	if err := (&png.Encoder{CompressionLevel: png.BestCompression}).Encode(&out, few); err != nil {
		t.Fatal(err)
	}
	return out.Bytes()
}

package chart

import (
	"bytes"
	"encoding/xml"
	"flag"
	"fmt"
	"image"
	"image/png"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"strayd/rules"
)

var (
	update = flag.Bool("update", false, "write the golden files anew; look at them before committing")
	look   = flag.String("look", "", "paint every chart into this folder, to look at it")
)

// invented is a series of so many business days with a rolling range like that of two deviations, made from a seed.
func invented(seed uint64, days int) *rules.Chart {
	c := &rules.Chart{Series: "alder-income", Range: "own", Marked: rules.NoDate}
	random := rand.New(rand.NewPCG(seed, 1))
	day, _ := rules.DateOf(2025, 12, 1)
	for len(c.Points) < days {
		if w := day.Weekday(); w == 0 || w == 6 {
			day++
			continue
		}
		mid, half := 0.0003+0.002*math.Sin(float64(day)/17), 0.012+0.003*math.Sin(float64(day)/23)
		p := rules.ChartPoint{Date: day, Return: random.NormFloat64() * 0.005, Finding: rules.Inside}
		p.Lines = rules.Lines{Low: rules.Some(mid - 1.4*half), High: rules.Some(mid + 1.4*half), WatchLow: rules.Some(mid - half), WatchHigh: rules.Some(mid + half)}
		c.Points = append(c.Points, p)
		day++
	}
	return c
}

func marked(c *rules.Chart, v float64) *rules.Chart {
	last := &c.Points[len(c.Points)-1]
	c.Marked, last.Return, last.Finding = last.Date, v, rules.Breach
	return c
}

// samples is every shape of chart that there is a way of drawing for.
func samples() map[string]*rules.Chart {
	plain := marked(invented(1, 60), -0.0412)
	reference := marked(invented(2, 60), 0.031)
	reference.Reference = "index-<b>one"
	for n := range reference.Points {
		reference.Points[n].Reference = rules.Some(reference.Points[n].Return*0.8 + 0.001)
	}
	early := marked(invented(5, 30), 0.02)
	for n := range early.Points[:12] {
		early.Points[n].Lines = rules.Lines{}
	}
	lower := marked(invented(6, 120), -0.03)
	for n := range lower.Points {
		lower.Points[n].High, lower.Points[n].WatchHigh = rules.Num{}, rules.Num{}
	}
	limit := invented(7, 250)
	for n := range limit.Points {
		limit.Points[n].Lines = rules.Lines{Low: rules.Some(-0.04), High: rules.Some(0.04)}
	}
	middle := invented(8, 500)
	middle.Points[80].Return, middle.Points[80].Finding = 0.03, rules.Breach
	middle.Marked = middle.Points[200].Date
	middle.Points[200].Return = 0.024
	zero := invented(9, 20)
	for n := range zero.Points {
		zero.Points[n].Return, zero.Points[n].Lines = 0, rules.Lines{}
	}
	hostile := marked(invented(10, 40), 0.03)
	hostile.Series, hostile.Reference = "</title><script>\u202ex</script>\x00"+strings.Repeat("long", 90), ""
	return map[string]*rules.Chart{"plain": plain, "reference": reference, "far": marked(invented(3, 60), -4.12), "early": early, "lower": lower,
		"limit": limit, "middle": middle, "zero": zero, "one": marked(invented(11, 1), 0.1), "hostile": hostile}
}

func TestPages(t *testing.T) {
	samples := samples()
	for _, name := range []string{"plain", "reference", "far", "early", "hostile"} {
		c := samples[name]
		got := SVG(c, "chart-1", Size{})
		path := filepath.Join("testdata", name+".svg")
		if *update {
			write(t, path, got)
		}
		if want, err := os.ReadFile(path); err != nil || string(want) != got {
			t.Errorf("%s: the drawing differs from %s (%v); -update writes it anew", name, path, err)
		}
	}
}

func write(t *testing.T, path, s string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(s), 0o644); err != nil {
		t.Fatal(err)
	}
}

// A page may set the drawing into itself whatever the series is called: it is well-formed, says what it shows, and holds nothing that acts,
// styles or fetches.
func TestPageIsSafe(t *testing.T) {
	for name, c := range samples() {
		s := SVG(c, "id", Size{})
		d := xml.NewDecoder(strings.NewReader(s))
		count := map[string]int{}
		for {
			token, err := d.Token()
			if err != nil {
				if err.Error() != "EOF" {
					t.Errorf("%s: %v", name, err)
				}
				break
			}
			if e, ok := token.(xml.StartElement); ok {
				count[e.Name.Local]++
				for _, a := range e.Attr {
					if a.Name.Local == "style" || a.Name.Local == "href" || strings.HasPrefix(a.Name.Local, "on") || strings.Contains(a.Value, "NaN") {
						t.Errorf("%s: %s has %s=%q", name, e.Name.Local, a.Name.Local, a.Value)
					}
				}
			}
		}
		for element, n := range count {
			switch element {
			case "svg", "title", "desc":
				if n != 1 {
					t.Errorf("%s: %d elements %s", name, n, element)
				}
			case "path", "text":
			default:
				t.Errorf("%s: an element %s", name, element)
			}
		}
	}
}

func TestPictures(t *testing.T) {
	for name, c := range samples() {
		b, err := PNG(c, "alder-income, ref 12", Size{})
		if err != nil {
			t.Fatal(err)
		}
		if *look != "" {
			write(t, filepath.Join(*look, name+".png"), string(b))
		}
		again, _ := PNG(c, "alder-income, ref 12", Size{})
		if !bytes.Equal(b, again) {
			t.Errorf("%s: painted twice, two pictures", name)
		}
		img, err := png.Decode(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		if got, want := fmt.Sprint(img.Bounds().Size()), fmt.Sprint(image.Pt(960, 540)); got != want {
			t.Errorf("%s: size %s, want %s", name, got, want)
		}
		if len(b) > 200_000 {
			t.Errorf("%s: %d bytes are too many for a message", name, len(b))
		}
	}
}

// What the words say of a chart, against a count by hand: 60 returns of which the last is flagged and one other was beyond.
func TestText(t *testing.T) {
	c := marked(invented(1, 60), -0.0412)
	c.Points[3].Finding = rules.Breach
	c.Points[59].Low, c.Points[59].High = rules.Some(-0.0193), rules.Some(0.0204)
	want := "60 returns of alder-income, Mon 2025-12-01 to Fri 2026-02-20. Flagged: -4.12 % on Fri 2026-02-20, expected -1.93 % to +2.04 %. " +
		"1 other return shown, too, beyond the range of the day."
	if got := Text(c); got != want {
		t.Errorf("%s\nwant\n%s", got, want)
	}
	if got := Text(&rules.Chart{}); got != "No return to show." {
		t.Error(got)
	}
	if _, err := PNG(&rules.Chart{}, "", Size{}); err == nil || SVG(&rules.Chart{}, "id", Size{}) != "" {
		t.Error("a chart of nothing is drawn")
	}
}

// Whatever is drawn lies within the drawing, and whatever is to scale keeps its order: over random charts, one of them far out.
func TestScale(t *testing.T) {
	for seed := range uint64(200) {
		c := invented(seed, 5+int(seed%90))
		c.Points[seed%5].Return *= math.Pow(10, float64(seed%7))
		low, high := extent(c)
		inside := 0
		for _, p := range c.Points {
			if p.Return >= low && p.Return <= high {
				inside++
			}
			if p.Low.V < low || p.High.V > high {
				t.Errorf("seed %d: a line of %s is cut off", seed, p.Date)
			}
		}
		if inside < len(c.Points)-1 {
			t.Errorf("seed %d: %d of %d returns to scale", seed, inside, len(c.Points))
		}
		if n := len(returnTicks(low, high)); n < 2 || n > 6 {
			t.Errorf("seed %d: %d ticks from %v to %v", seed, n, low, high)
		}
		from, to := c.Points[0].Date, c.Points[0].Date+rules.Date(1+seed*seed/10)
		if n := len(dateTicks(from, to)); n > 6 || to-from > 7 && n < 1 {
			t.Errorf("seed %d: %d date ticks over %d days", seed, n, to-from)
		}
	}
}

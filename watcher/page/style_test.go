package page

import (
	"math"
	"regexp"
	"strconv"
	"testing"
)

// luminance is the relative luminance of a colour such as #1d2733 (WCAG 2.2, "relative luminance").
func luminance(t *testing.T, hex string) float64 {
	t.Helper()
	part := func(at int) float64 {
		n, err := strconv.ParseUint(hex[at:at+2], 16, 8)
		if err != nil {
			t.Fatal(err)
		}
		v := float64(n) / 255
		if v <= 0.04045 {
			return v / 12.92
		}
		return math.Pow((v+0.055)/1.055, 2.4)
	}
	return 0.2126*part(1) + 0.7152*part(3) + 0.0722*part(5)
}

// Words keep 4.5 to 1 to every ground that they stand on, in both schemes, and what shows the focus 3 to 1 (WCAG 2.2, 1.4.3 and 1.4.11).
func TestContrast(t *testing.T) {
	text, err := files.ReadFile("desk.css")
	if err != nil {
		t.Fatal(err)
	}
	schemes := regexp.MustCompile(`:root \{([^}]*)\}`).FindAllSubmatch(text, 2)
	if len(schemes) != 2 {
		t.Fatalf("%d schemes", len(schemes))
	}
	for n, scheme := range schemes {
		colours := map[string]string{}
		for _, c := range regexp.MustCompile(`--([a-z-]+): (#[0-9a-f]{6})`).FindAllSubmatch(scheme[1], -1) {
			colours[string(c[1])] = string(c[2])
		}
		for word, least := range map[string]float64{"ink": 4.5, "soft": 4.5, "deep": 4.5, "warn": 4.5, "good": 4.5, "focus": 3} {
			for _, ground := range []string{"ground", "tint", "warn-ground"} {
				a, b := luminance(t, colours[word]), luminance(t, colours[ground])
				if ratio := (max(a, b) + 0.05) / (min(a, b) + 0.05); ratio < least {
					t.Errorf("scheme %d: %s on %s has %.2f to 1, less than %.1f", n, word, ground, ratio, least)
				}
			}
		}
	}
}

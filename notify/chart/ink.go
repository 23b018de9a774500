package chart

import "image/color"

// ink is what something is drawn with: a colour on white in a picture, a class and a plain paint on a page.
type ink struct {
	class string
	paint string // without a style: currentColor goes with dark and light
	faint string // opacity of the paint
	rgb   color.NRGBA
}

// RGBA makes an ink a colour of the drawing library.
func (i ink) RGBA() (r, g, b, a uint32) { return i.rgb.RGBA() }

func grey(v uint8) color.NRGBA { return color.NRGBA{v, v, v, 255} }

// The inks. Their greys on white keep lines at 3 to 1 and words at 4.5 to 1 or more (WCAG 2.2, 1.4.3 and 1.4.11); shades are told apart by their
// edges.
var (
	paper      = ink{"chart-paper", "none", "1", grey(255)}
	rangeInk   = ink{"chart-range", "currentColor", "0.09", grey(236)}
	watchInk   = ink{"chart-watch", "currentColor", "0.09", grey(218)}
	edgeInk    = ink{"chart-edge", "currentColor", "0.5", grey(136)}
	zeroInk    = ink{"chart-zero", "currentColor", "0.35", grey(170)}
	returnInk  = ink{"chart-return", "currentColor", "1", color.NRGBA{31, 60, 96, 255}}
	otherInk   = ink{"chart-reference", "currentColor", "0.75", color.NRGBA{120, 88, 20, 255}}
	flagInk    = ink{"chart-flag", "currentColor", "1", color.NRGBA{160, 32, 24, 255}}
	wordInk    = ink{"chart-word", "currentColor", "1", grey(60)}
	headingInk = ink{"chart-heading", "currentColor", "1", grey(20)}
)

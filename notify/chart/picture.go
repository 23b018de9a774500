package chart

import (
	"bytes"
	"errors"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"

	"strayd/rules"
)

// errNothing is the error for a chart without a point.
var errNothing = errors.New("a chart needs one return at least")

// dots to an inch: two for each point, so that a phone shows it sharp.
const dots = 144

// PNG paints a chart on white, with a heading above it, for where a page's style does not reach. The heading is one line; what does not fit is
// cut off.
func PNG(c *rules.Chart, heading string, s Size) ([]byte, error) {
	if len(c.Points) == 0 {
		return nil, errNothing
	}
	s = s.or()
	img := vgimg.NewWith(vgimg.UseWH(vg.Length(s.Width), vg.Length(s.Height)), vgimg.UseDPI(dots))
	lay(c, draw.New(img), heading)
	var b bytes.Buffer
	_, err := vgimg.PngCanvas{Canvas: img}.WriteTo(&b)
	return b.Bytes(), err
}

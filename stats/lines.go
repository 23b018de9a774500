package stats

import (
	"fmt"
	"strconv"
	"strings"
)

// Side says how many tails a line cuts off.
type Side uint8

const (
	// TwoSided cuts off both tails, half of the probability each.
	TwoSided Side = iota
	// OneSided cuts off one.
	OneSided
)

func (s Side) tails() int {
	if s == OneSided {
		return 1
	}
	return 2
}

// Line is one line said in every way: the probability beyond it, the share inside it, the z at which it stands, and once in how
// many observations an ordinary one is beyond it.
type Line struct {
	Tail, Confidence, Z, Days float64
}

// LineOfTail is the line beyond which a share tail lies. It is an error when tail is not from SmallestTail to below 1.
func (t Tail) LineOfTail(tail float64, side Side) (Line, error) {
	if !(tail >= SmallestTail && tail < 1) {
		return Line{}, fmt.Errorf("tail probability %v: need %v to less than 1", tail, SmallestTail)
	}
	z, err := t.Quantile(max(tail/float64(side.tails()), SmallestTail))
	return Line{tail, Complement(tail), z, 1 / tail}, err
}

// LineOfConfidence is the line within which a share confidence lies. It is an error when that is not above 0 and below 1.
func (t Tail) LineOfConfidence(confidence float64, side Side) (Line, error) {
	if !(confidence > 0 && confidence < 1) {
		return Line{}, fmt.Errorf("confidence %v: need more than 0 and less than 1", confidence)
	}
	l, err := t.LineOfTail(Complement(confidence), side)
	l.Confidence = confidence
	return l, err
}

// LineOfZ is the line that stands at z. It is an error when z is not above 0 and finite.
func (t Tail) LineOfZ(z float64, side Side) (Line, error) {
	if !(z > 0 && clampZ(z) == z) {
		return Line{}, fmt.Errorf("line at z %v: need more than 0 and finite", z)
	}
	tail, _ := t.Upper(z)
	if side == TwoSided {
		tail, _ = t.TwoSided(z)
	}
	return Line{tail, Complement(tail), z, 1 / tail}, nil
}

// Complement is 1 - x for x from 0 to 1, with as many decimals as x has when written shortest: 1 - 0.9973 is 0.0027, the float
// nearest to that decimal, where the machine's difference is 0.00269999999999992.
func Complement(x float64) float64 {
	text := strconv.FormatFloat(x, 'f', -1, 64)
	_, decimals, _ := strings.Cut(text, ".")
	if len(decimals) > 15 {
		return 1 - x
	}
	v, _ := strconv.ParseFloat(strconv.FormatFloat(1-x, 'f', len(decimals), 64), 64)
	return v
}

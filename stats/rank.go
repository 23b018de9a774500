package stats

import "math"

// RankTail is the two-sided tail of a value by its rank among the n values of a window that does not contain it:
//
//	p = min(1, 2 min((atMost+1)/(n+1), (atLeast+1)/(n+1)))
//
// atMost and atLeast count the values <= and >= it. The smallest possible p is 2/(n+1).
func RankTail(atMost, atLeast, n int) float64 {
	return min(1, float64(2*(min(atMost, atLeast)+1))/float64(n+1))
}

// RankLower is the one-sided form: small for a value far down.
func RankLower(atMost, n int) float64 { return float64(atMost+1) / float64(n+1) }

// RankUpper is the one-sided form: small for a value far up.
func RankUpper(atLeast, n int) float64 { return float64(atLeast+1) / float64(n+1) }

// RankMark is the order statistic at which a line of the given level stands: the mark-th smallest and mark-th greatest of n
// values. A value strictly beyond it has a tail of at most level, and no other has.
//
//	two-sided mark = floor(level (n+1)/2), one-sided floor(level (n+1))
//
// A level that falls short of a whole mark by 1e-12 of itself, as 1 - 0.9 does, reaches it. ok is false when mark is below 1:
// the level is below the floor 2/(n+1), or 1/(n+1) one-sided, that n values can say.
func RankMark(level float64, n int, side Side) (mark int, ok bool) {
	if !(level > 0 && level < 1) || n < 1 {
		return 0, false
	}
	whole := float64(n+1) / float64(side.tails())
	mark = int(math.Floor(float64(float64(level*(1+1e-12)) * whole)))
	return mark, mark >= 1
}

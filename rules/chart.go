package rules

// Chart is a series with one of its ranges over some dates, as plain figures for whoever draws it. Returns are fractions.
type Chart struct {
	Series    string
	Range     string
	Reference string // of the dashed line, "" for none
	Marked    Date   // the date that a flag is about, NoDate for none
	Points    []ChartPoint
}

// ChartPoint is one date of a chart. Its lines are those that the return was held against, from the window before it.
type ChartPoint struct {
	Date      Date
	Return    float64
	Reference Num
	Finding   Finding
	Lines
}

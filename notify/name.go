package notify

// Name makes a name from a file safe and short enough to stand within a line. A name that shows nothing is quoted.
func Name(s string) string { return name(s) }

// Safe makes text from a file safe to show as one line, at most so many runes long.
func Safe(s string, most int) string { return cut(safe(s), most) }

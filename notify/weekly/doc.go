// Package weekly puts the weekly log into words: a page to print (HTML), text, CSV, and the few lines of a message.
//
// A page is made of sections, a section of figures and tables, and every figure of cells: a value, what it is a part of, and the same
// of the week before. All forms are written from the same page, so that none can say otherwise than another.
//
// Traps: names and notes come from other people's files. In text and HTML they are made safe and short by notify.Name, in CSV they are
// whole and safe to open in a spreadsheet.
package weekly

// Package spreadsheet reads workbooks of Office Open XML (.xlsx) as watcher.Grid. It is the only door to the library.
//
// A cell is taken for what it is, not for how it is shown: a number with all its digits, a day where a number is formatted as one (both
// systems of serial days, from 1900 and from 1904), the value that a formula was last computed to. A number that is shown as per cent says
// so, since it holds the fraction. A text stays a text, even one that looks like a number, and is read as the feed declares.
//
// Trap: the library reads a sheet as a stream without saying where it broke off, and tells types and formats only of a sheet that it holds whole. So
// a sheet is read both ways, every part is unpacked once beforehand against its checksum and the bounds, and a sheet has a greatest size.
package spreadsheet

package watcher

import "strayd/rules"

// TermsReader reads the terms of values as they stand, fast where neighbouring values are asked for in turn.
type TermsReader struct {
	view  View
	id    uint16 // 0 while the ledger holds none
	date  rules.Date
	block uint32
	codes []int64
}

// NewTermsReader prepares a reader of the terms in a view.
func NewTermsReader(v View) (*TermsReader, error) {
	ids, err := rangeIDs(v)
	return &TermsReader{view: v, id: ids[termsKey], date: rules.NoDate, codes: make([]int64, BlockSize)}, err
}

// At is the terms of a value.
func (r *TermsReader) At(date rules.Date, series uint32) (rules.Terms, error) {
	if block := series / BlockSize; r.id != 0 && (date != r.date || block != r.block) {
		if err := termsHeld(r.view, r.id, date, block, 0, r.codes); err != nil {
			return rules.Terms{}, err
		}
		r.date, r.block = date, block
	}
	return rules.TermsOf(r.codes[series%BlockSize]), nil
}

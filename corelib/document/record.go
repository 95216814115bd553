package document

// A Record remembers, for every value of a document, where it came from.
type Record struct{}

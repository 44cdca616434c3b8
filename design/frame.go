package design

// A Frame is a plan together with the rows it is fitted to: rows of weight or
// count 0 and rows set aside are not in it. Slices are shared and must not be
// modified; n is the number of rows in the frame. Goroutines may share it.
type Frame struct {
	Plan   *Plan
	Matrix *Matrix // n×p

	Y, YLo         []float64 // the modelled response, n; YLo nil when all zero
	Known, KnownLo []float64 // sum of the known terms, n; nil when there are none
	Weights        []float64 // n, all > 0; nil when the model has none
	Counts         []float64 // n, whole, all > 0; nil when the model has none
	OutOf          []float64 // the n of "k out of n"; nil when not written
	Per            []float64 // the e of "k per e"; nil when not written

	Given    int   // rows of the table
	Rows     []int // n row numbers of the table, from 1; nil when all rows are in
	SetAside []int // row numbers set aside as incomplete, ascending
	Zero     []int // row numbers with weight or count 0, ascending

	Notes []Note // such as "machine looks like a code: did you mean cat(machine)?"
}

// Row gives the table's row number, from 1, of row i of the frame, from 0.
func (f *Frame) Row(i int) int {
	if f.Rows == nil {
		return i + 1
	}
	return f.Rows[i]
}

// Cases is the sum of counts, n when there are none: the number of cases the
// frame stands for.
func (f *Frame) Cases() float64 {
	if f.Counts == nil {
		return float64(len(f.Y))
	}
	s := 0.0
	for _, m := range f.Counts {
		s += m
	}
	return s
}

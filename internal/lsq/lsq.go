// Package lsq solves linear least-squares problems to the last digit of
// float64.
//
// The way of a problem: the columns are scaled by powers of two, factorised by
// Householder QR with column pivoting (rank is decided there, on relative
// norms, so that the unit of a column never matters), and the solution is
// refined as the augmented system with residuals in double-double:
//
//	Å. Björck, "Iterative refinement of linear least squares solutions I",
//	BIT 7 (1967) 257-278.
//
// Tall problems are factorised in blocks of rows, whose triangles are then
// factorised together:
//
//	J. Demmel, L. Grigori, M. Hoemmen and J. Langou, "Communication-optimal
//	parallel and sequential QR and LU factorizations", SIAM J. Sci. Comput.
//	34 (2012) A206-A239.
//
// The inverse of X'X, leverages and quadratic forms come from the rows of
// X R⁻¹ formed in double-double, whose Gram matrix is nearly the identity
// (see [Factor.Inverse]).
package lsq

import "example.com/trammel/internal/dd"

// Tolerance is the relative remaining norm below which a column counts as
// dependent on the columns before it: the part of the column that is
// orthogonal to them, divided by the column's own norm. Rounding leaves about
// 1e-16 times a small factor of a truly dependent column.
const Tolerance = 1e-13

// A Problem is: minimise ‖y - X b‖₂ over b, with X n×p. Rows that carry
// weights are already multiplied by the square root of their weight, in
// double-double (hi + lo parts). Entries are finite.
type Problem struct {
	N, P int
	X    []float64 // n×p, column-major: column j is X[j*N:(j+1)*N]
	XLo  []float64 // low parts of X, same layout; nil when all are zero
	Y    []float64 // n; for the caller's use: Solve is handed its right-hand side
	YLo  []float64 // low parts of Y; nil when all are zero
	// Workers is the number of goroutines that share the row blocks of a tall
	// problem; 0 and 1 mean none besides the caller. Results are the same bit
	// for bit for every number.
	Workers int
}

// A Solution is the refined least-squares solution. Solve reuses its slices
// when they are long enough.
type Solution struct {
	B, BLo []float64 // p estimates, hi + lo; 0 for dependent columns
	R, RLo []float64 // n residuals y - X b, hi + lo
	RSS    dd.Num    // Σ r²
	Passes int       // refinement passes done
}

// A Workspace holds buffers between factorisations. Its zero value is ready
// to use. A Factor made with a Workspace is valid until the next Factorize
// with the same Workspace.
type Workspace struct {
	factor Factor
	floats []float64
	ints   []int
	white  []float64
	zero   []float64
}

// A Factor is the pivoted QR factorisation of the column-scaled X. It keeps a
// reference to the Problem, which must not change meanwhile. It is not safe
// for concurrent use unless a method says so.
type Factor struct {
	p    *Problem
	ws   *Workspace
	rank int

	workers int // goroutines for passes over the rows

	perm  []int     // perm[k] is the column at position k
	scale []float64 // by column: the power of two applied to the column
	norm  []float64 // by column: norm after scaling
	pivot []float64 // by position: relative remaining norm

	leaves leafBlocks // row blocks factorised first; none for small problems
	root   []float64  // m×p column-major: R above, Householder vectors below
	m      int        // rows of root
	tau    []float64  // of root
	block  int        // rows of a block in passes over the rows
	blocks int        // number of such blocks

	far, farLo [][]float64 // scaled copies of columns of extreme size, by column; usually nil

	f        []float64 // n: residual of the augmented system, then its correction
	side     side
	t        []float64 // m: root part of Q'f, when there are leaves
	x, xlo   []float64 // rank: solution in scaled, permuted form
	g, h, dx []float64 // rank
	work     []float64 // 2·block per worker: dd accumulators
	sums     []float64 // 2·rank per block: partial sums of X'r
	white    whitened
	cond     float64 // 0 until asked for
}

// Rank returns the number of independent columns.
func (f *Factor) Rank() int { return f.rank }

// Perm returns the order of the columns: the first Rank entries are the
// independent columns in the order of pivoting, the rest are dependent on
// them. Shared, do not modify.
func (f *Factor) Perm() []int { return f.perm }

// Pivots returns, for each step of the pivoting, the norm of the chosen
// column's part orthogonal to the earlier ones, relative to the column's own
// norm. It has min(n, p) entries at most; when the last is below Tolerance it
// belongs to the first dependent column. Shared, do not modify.
func (f *Factor) Pivots() []float64 { return f.pivot }

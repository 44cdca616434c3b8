package lsq

// leafBlocks are blocks of rows factorised on their own, each contiguous and
// column-major; their triangles are stacked to form the root. A block is
// chosen to stay in cache while all its columns are worked on.
type leafBlocks struct {
	rows, count int // rows of all blocks but the last, which has up to 2·rows-1
	a           []float64
	tau         []float64
}

// Elements of a leaf (256 KiB), the largest width for which it stays so, and
// the fewest leaves worth the trouble.
const (
	leafElements = 1 << 15
	fewestLeaves = 3
)

// leafPlan decides on row blocks: none for small or wide problems.
func leafPlan(n, p int) (rows, count int) {
	if p == 0 {
		return 0, 0
	}
	rows = max(leafElements/p, 4*p)
	count = n / rows
	if count < fewestLeaves {
		return 0, 0
	}
	return rows, count
}

// span returns the rows of leaf b.
func (l *leafBlocks) span(b, n int) (from, to int) {
	from, to = b*l.rows, (b+1)*l.rows
	if b == l.count-1 {
		to = n
	}
	return from, to
}

// block returns the elements and taus of leaf b.
func (l *leafBlocks) block(b, from, to, p int) (a, tau []float64) {
	return l.a[from*p : to*p], l.tau[b*p : (b+1)*p]
}

// factorizeLeaf scales and factorises leaf b and puts its triangle into the
// root, where rows from other leaves surround it.
func (f *Factor) factorizeLeaf(_, b int) {
	n, p := f.p.N, f.p.P
	from, to := f.leaves.span(b, n)
	a, tau := f.leaves.block(b, from, to, p)
	m := to - from
	for j := range p {
		scaleTo(a[j*m:(j+1)*m], f.p.X[j*n+from:j*n+to], f.scale[j])
	}
	householder(a, m, p, tau)
	for j := range p {
		col := f.root[j*f.m+b*p : j*f.m+(b+1)*p]
		copy(col, a[j*m:j*m+j+1])
		clear(col[j+1:])
	}
}

// rotate replaces f.f by Q'f and returns the part of it that belongs to the
// root's rows, to be handed back to rotateBack changed or not.
func (f *Factor) rotate() []float64 {
	top := f.f
	if f.leaves.count > 0 {
		top = f.t
		f.each(f.leaves.count, (*Factor).rotateLeaf)
	}
	applyQT(f.root, f.m, f.rank, f.tau, top)
	return top
}

func (f *Factor) rotateLeaf(_, b int) {
	p := f.p.P
	from, to := f.leaves.span(b, f.p.N)
	a, tau := f.leaves.block(b, from, to, p)
	applyQT(a, to-from, p, tau, f.f[from:to])
	copy(f.t[b*p:(b+1)*p], f.f[from:from+p])
}

// rotateBack undoes rotate.
func (f *Factor) rotateBack() {
	if f.leaves.count == 0 {
		applyQ(f.root, f.m, f.rank, f.tau, f.f)
		return
	}
	applyQ(f.root, f.m, f.rank, f.tau, f.t)
	f.each(f.leaves.count, (*Factor).rotateLeafBack)
}

func (f *Factor) rotateLeafBack(_, b int) {
	p := f.p.P
	from, to := f.leaves.span(b, f.p.N)
	a, tau := f.leaves.block(b, from, to, p)
	copy(f.f[from:from+p], f.t[b*p:(b+1)*p])
	applyQ(a, to-from, p, tau, f.f[from:to])
}

package formula

import "github.com/alecthomas/participle/v2/lexer"

// MaxTerms is the greatest number of terms that a model may expand to. [Parse]
// bounds the number before anything expands; package design counts exactly.
const MaxTerms = 10000

// Further limits of the language, checked before anything of that size is made.
const (
	maxText    = 64 << 10 // bytes of one text
	maxNesting = 200      // open parentheses and runs of unary - and of ^
)

// Limits of single arguments. Beyond them a basis has no use: neighbouring
// columns no longer differ in float64.
const (
	maxPower    = 64   // powers, legendre
	maxBasis    = 1000 // spline, harmonics
	maxOrder    = 1000 // upto
	maxLiteral  = 400  // bytes of a number; strconv fails beyond 800
	maxSentence = 60   // characters of a piece of text quoted in a sentence
	maxMend     = 400  // bytes of a mend that a hint still shows
)

// checkNesting counts on tokens how deep a parser would descend: open
// parentheses and, at each of them, the run of unary minus signs and powers.
func checkNesting(tokens []lexer.Token) *Error {
	runs := []int{0} // one per open parenthesis
	depth := 0
	operand := false // the previous token ends an operand
	for _, t := range tokens {
		top := len(runs) - 1
		was := operand
		operand = false
		switch t.Type {
		case tokenName, tokenQuoted, tokenLevel, tokenNumber:
			operand = true
			continue
		case tokenKeyword:
			operand = t.Value == "pi" || t.Value == "true" || t.Value == "false" || t.Value == "intercept"
			if !operand {
				depth -= runs[top]
				runs[top] = 0
			}
			continue
		}
		switch {
		case t.Value == "(" || t.Value == "[":
			runs = append(runs, 0)
			depth++
		case t.Value == ")" || t.Value == "]":
			operand = true
			if top > 0 {
				depth -= runs[top] + 1
				runs = runs[:top]
			}
		case t.Value == "^", t.Value == "-" && !was:
			runs[top]++
			depth++
		default:
			depth -= runs[top]
			runs[top] = 0
		}
		if depth > maxNesting {
			return refuse(codeTooDeep, spanOf(t), "split it into parts",
				"the text is nested deeper than %d levels here", maxNesting)
		}
	}
	return nil
}

// countTerms bounds the number of terms that t expands to, before like terms
// merge. It never exceeds MaxTerms+1.
func countTerms(t Term) int {
	switch t := t.(type) {
	case *Terms:
		n := 0
		for _, it := range t.Items {
			n = saturate(n + countTerms(it.Term))
		}
		return n
	case *Cross:
		n := 1
		for _, f := range t.Factors {
			n = saturate(n * (1 + countTerms(f)))
		}
		return n - 1 + n/(MaxTerms+1)
	case *By:
		return countProduct(t.Factors)
	case *Inside:
		return countProduct(t.Factors)
	case *Call:
		switch n := len(t.Args); t.Func {
		case "powers":
			if k, ok := constant(t.Args[1]); ok && k >= 1 && k <= maxPower {
				return int(k)
			}
		case "quadratic":
			return saturate(2*n + saturate(n*(n-1)/2))
		case "upto":
			return countUpTo(int(min(t.Order.Value, maxOrder)), countTerms(t.Terms))
		}
	}
	return 1
}

func countProduct(factors []Term) int {
	n := 1
	for _, f := range factors {
		n = saturate(n * countTerms(f))
	}
	return n
}

// countUpTo is the sum of the binomial coefficients (m over j), j = 1 … k.
func countUpTo(k, m int) int {
	sum, choose := 0, 1
	for j := 1; j <= min(k, m); j++ {
		// choose <= MaxTerms+1 and m <= MaxTerms+1: the product fits 32 bits
		// only just, so it is formed in 64.
		next := int64(choose) * int64(m-j+1) / int64(j)
		if next > MaxTerms {
			return MaxTerms + 1
		}
		choose = int(next)
		sum = saturate(sum + choose)
	}
	return sum
}

func saturate(n int) int { return min(n, MaxTerms+1) }

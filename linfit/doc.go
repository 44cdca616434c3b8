// Package linfit fits terms-form models with normal errors by least squares:
// ordinary and weighted, with counts and known terms, with ordinary or robust
// standard errors. [Fit] takes a model text and a table; [FitFrame] takes rows
// that package design has prepared already. Both give a trammel.Result, which
// answers every further question.
//
// The normal path factorises the expanded matrix and refines the solution with
// residuals in double-double, so that coefficients are right to about the last
// digit of the data as float64. Tall tables of categories take a path that
// streams the rows into sums by cell and never expands them; the result's Path
// names the one taken. No result depends on the number of workers.
package linfit

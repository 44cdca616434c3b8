// Package formula turns the text of a model into a tree and back. It knows the
// language's syntax and every rule that needs no data; columns, levels and
// numbers are the business of package design.
//
// The way of a model is declare, compile, fit, ask: [Parse] gives a [Model],
// design.Compile compiles it against a table, a fitter such as linfit.Fit gives
// a trammel.Result, and the functions of package trammel answer questions about
// it. Most programs hand the text straight to a fitter and meet this package
// only in its errors.
package formula

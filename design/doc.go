// Package design holds tables of data, and compiles the terms of a model
// against a table into a plan, a design matrix and the words that explain its
// columns.
//
// The way of a model is declare, compile, fit, ask. [ReadCSV], [NewTable],
// [FromStructs] and [FromRows] make a [Table]. [Prepare] expands the terms,
// finds levels and basis constants in the rows to fit, codes the columns by one
// rule, checks their rank, and gives a [Frame]: the [Plan], the [Matrix] and the
// response, ready for a fitter. [Plan.Matrix] gives the same columns for new
// rows. Everything that is wrong with data or model is refused by an [*Error].
//
// Crossing and its expansion follow G. N. Wilkinson and C. E. Rogers, "Symbolic
// description of factorial models for analysis of variance", Applied
// Statistics 22 (1973) 392-399.
package design

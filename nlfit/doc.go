// Package nlfit fits equations by least squares: the law as it stands in the
// book, such as
//
//	shrink = limit*(1 - exp(-k*hold)) fitting limit > 0, k by cat(furnace)
//
// [Fit] parses and compiles the text, finds starting values of its own where
// none are given, searches with exact derivatives, and returns a
// [trammel.Result], of which every question of package trammel can be asked. The
// result lists the distinct minima that were found; a search that did not
// converge gives the partial result together with an [*Error].
package nlfit

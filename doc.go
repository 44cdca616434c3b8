// Package trammel answers questions about fitted models. It holds the result
// contract that every fitter of the module fulfils, and, written once over that
// contract, everything that can be asked of a result.
//
// A fit goes through four phases, each with one main type:
//
//   - declare: a line of text becomes a [formula.Model] (package formula);
//   - compile: the model and a [design.Table] become a [design.Plan], which fixes
//     levels, references and basis constants and names every column (package
//     design);
//   - fit: linfit.Fit does all three phases and returns a [Result];
//   - ask: the functions of this package take that Result.
//
// The questions and where their answers are found:
//
//	what is each coefficient, how surely?         Coefficients, Derived, Correlation
//	does this whole term matter?                  Terms, SequentialTerms
//	how well does the model describe the data?    Result.Goodness, LackOfFit
//	what is expected at other settings?           Predict, PredictTo
//	which rows should be looked at?               Diagnose
//	all of it, to read or to pass on              Summarize, then WriteReport or WriteJSON
//
// Numbers that are not defined (a standard error when there are as many
// coefficients as rows, a p-value of an exact fit) are NaN, and null in JSON:
// they are never replaced by a plausible value. Confidence levels are given as
// numbers in (0, 1); 0 stands for 0.95.
//
// Intervals, tests and p-values assume that the model is right, that rows are
// independent, and, unless the fit used a robust covariance, that the scatter is
// the same (up to the stated weights) everywhere. What the checks of a Summary
// say should be read first.
package trammel

// Package logs runs an estimator over a recorded log (CSV) of the real machine
// and holds its innovations against what model, noise figures and gain promise.
//
// A Layout says which columns belong to which signal. Open reads a log once from
// end to end, so that everything wrong with it is known before anything is
// computed or written, and measures its period. Replay streams it a second time
// through the estimator. Nothing here keeps more than a few rows, except Load,
// which takes a window of a log into memory for repeated runs.
package logs

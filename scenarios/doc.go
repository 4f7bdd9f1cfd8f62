// Package scenarios says what happens to the real plant and runs it beside its
// estimator.
//
// A scenario file names drives that the estimator knows, surprises that it does
// not, the real plant's own parameters, noise, sensor faults and the limits that
// a design must meet. Parse checks it against its plant. A Runner simulates the
// real plant exactly, sample by sample, with seeded noise, and the estimator
// with the signals that the firmware would have.
package scenarios

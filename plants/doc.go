// Package plants reads plant files and turns them into the models that
// estimators are designed for.
//
// A plant file (TOML or JSON, the same tree) names parameters, matrices with
// arithmetic on these parameters, signals with units, scales and noise, and
// what the model leaves out. Parse checks all of it and reports the first
// thing that is wrong with its place; Plant.Model evaluates the matrices at
// given parameters and adds lags, unknowns, sampling and delays.
package plants

// Package estimator designs and judges linear state estimators.
//
// A Model holds the matrices an estimator is designed for. A Designer analyses
// it once (which modes the sensors give, what the best linear estimator could
// do) and then turns wanted poles, or a gain found elsewhere, into a Design:
// the gain, the poles really reached, the steady-state noise, the start-up
// transient and the margins of the control loop.
//
// Continuous time:          x̂' = A x̂ + B u + L (y − C x̂ − D u)
// Discrete, prediction:     x̂⁺ = A x̂ + B u + L (y − C x̂ − D u)
// Discrete, current:        x̂f = x̂ + Lf (y − C x̂ − D u),  x̂⁺ = A x̂f + B u,  L = A Lf
//
// Throughout, F = A − L C. n is the number of states, m of inputs, p of sensors
// and q of process-noise inputs. Units are the caller's; time is in seconds and
// frequency in rad/s. The package does no input or output.
package estimator

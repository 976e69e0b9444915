// Package lsq is non-linear least squares with bounds: a Levenberg–Marquardt
// iteration on an analytic Jacobian. It knows no physics.
//
// The sum that is made small is χ² = Σ r_i(x)², with residuals already divided by
// their errors, so that a change of 1 in χ² is one standard error.
package lsq

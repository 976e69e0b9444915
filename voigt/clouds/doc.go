// Package clouds fits velocity components ("clouds") to interstellar absorption lines:
// a velocity v, a Doppler parameter b and a column density N for each species of each
// cloud, from any number of lines, orders, exposures and instruments at once.
//
// # Model
//
// The flux of pixel i of a window is
//
//	F_i = C(λ_i) ( ∫ box_i [ L_s ⊗ S e^{−τ} ] + z ),
//	τ(λ) = Σ_clouds Σ_lines Σ_parts s_k τ₀ H(a, (v_λ − v − Δv_k)/b),
//
// with τ₀ and a as in package voigt, S a narrow stellar or telluric transmission
// (Window.Factor), L_s the instrument's line spread function with its width scaled by s,
// the box of the pixel integrated exactly (package lsf), C a Legendre polynomial and z
// light that was added to the spectrum, as a part of C. The transmission is convolved,
// never τ.
//
//	quantity                        unit      how it enters
//	v of a cloud, of a species      km/s      free, tied, offset, fixed
//	b of a cloud, of a species      km/s      free, tied, or b² = 2kT/m + b_turb²
//	N of a species in a cloud       cm⁻²      log₁₀N, or N itself; tied by a ratio or by Boltzmann's law
//	ln s of an instrument           1         prior 0 ± 5 % by default
//	velocity zero of an exposure    km/s      prior 0 ± Window.VelocityErr
//	Legendre coefficients of C      flux      linear: solved exactly at every step
//	z of a window                   1         linear as well, prior Window.Zero ± ZeroErr
//
// Every parameter may be fixed, bounded, tied to others, or given a Gaussian prior (Par).
//
// # Fit
//
// χ² is that of the residuals whitened with the measured correlation of the noise
// (Window.Rho; the Cholesky factor of the banded covariance of the pixels that are not
// masked) and of the priors. Continuum and zero level are projected out (Kaufman 1975,
// BIT 15, 49; from memory), the rest is found by Levenberg–Marquardt with analytic
// derivatives (package internal/lsq). Fitter.Fit starts from the user's clouds,
// Fitter.FitBest from random ones about them as well, Search finds number and places
// itself.
//
// # Errors
//
// The covariance is that of all parameters together, the continuum, the zero levels, the
// widths and zero points included. It is split by cause into the shifts of a
// budget.Number: one cause after the other in the order velocity zero, profile, zero
// level, continuum, photon, each given what stands before; the squares add up to the
// whole. The strengths of the lines are taken as known in the fit; what 1σ of each would
// change is added as a shift with the line's key. A direction that the data do not
// determine leaves NaN in the Number of a parameter (kind "none") but not in a total
// that does not depend on it. A b below a third of the instrument's is an upper limit; a
// column that is not detected is N ± σ with a limit of 3σ.
//
// Where a parabola is a poor guide to χ² (saturated and blended lines), Fitter.Profile gives
// intervals by profile likelihood, Fitter.Sampler the posterior, Fitter.Bootstrap refits
// of simulated spectra, and Fitter.UpperLimit limits by Δχ².
//
// # Number of clouds
//
// With a number that was chosen from the data, errors of single clouds hold only if
// the number is right (Leeb & Pötscher 2005); Result.Conditional
// says so. What stays are sums over ranges of velocity (Found.Ranges), with an error of
// their own for the structure: the spread over all solutions within ΔBIC < 6, and what a
// further cloud could hide, by the profile likelihood of the column with one more. The
// latter is large, and upward, where lines are saturated and not resolved.
//
// # Use
//
//	f, err := clouds.New(clouds.Problem{Windows: windows, Clouds: starts}, clouds.Options{})
//	r, err := f.Fit()          // r.Clouds, r.Totals, r.Windows, r.Notes
//	err = f.Asymmetric(&r)     // saturated columns: errors from their profiles
//	c, err := f.Curves(0, r.X) // for a figure of the first window
//
// A Fitter belongs to one goroutine. One problem with other data (SetFlux) needs no new
// one; nothing is allocated while χ² is minimised.
package clouds

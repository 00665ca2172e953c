// Package fit fits models to data with errors: linear least squares,
// polynomials and extrapolation to zero, nonlinear least squares, and the
// bootstrap.
//
// Data are slices of equal length. sigma holds the standard error of each y;
// nil means that the errors are equal and unknown, and then the covariance is
// scaled by the scatter about the fit. With sigma given, the covariance is that
// of the given errors alone, and [Report.Goodness] says whether the scatter
// agrees with them.
//
// Matrices are row-major. A report owns its memory. Data that cannot be fitted
// (lengths that differ, NaN, too few points, columns that depend on each other)
// are an error that says so; no number is returned in its place. A nonlinear
// fit that stops short is not an error: [Report.Converged] tells.
//
// Linear problems go through a QR decomposition of the scaled design matrix;
// nonlinear ones through the damped Gauss-Newton method of Levenberg 1944 and
// Marquardt 1963 with the scaling of More 1978. Bootstrap: Efron 1979.
package fit

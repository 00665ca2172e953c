// Package openblas speaks to the library behind the build tag netlib where gonum's bindings have no word for it. It is a package of its
// own because Go allows no assembly beside cgo. Without the tag it is empty.
package openblas

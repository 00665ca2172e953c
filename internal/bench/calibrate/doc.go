// Command calibrate shows how far the quoted errors can be trusted:
//
//	go run ./internal/bench/calibrate [--detail] [--misses] [--json] [--markdown] [--from FILE] [--only EXPRESSION] [--half HALF]
//
// It searches the models of internal/calibration, whose ground states are known, at wishes from 1e-3 to 1e-9 and at caps on the bond, and compares what
// is quoted with what is true: energies, values on every site, long correlations, entropies of every cut. The table counts each model once. The constants of the
// estimates come from the models of the row "tuning"; the rows "test" and "held back" are what they are worth. The result on record is results.md, printed
// by --markdown. Searches take four CPU minutes; --json keeps what they found, and --from reads it again.
package main

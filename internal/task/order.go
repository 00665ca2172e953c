package task

import "slices"

// ByWork returns the indices of work, largest first, equal ones in their order: the order to hand out pieces in, so that no large one
// comes last.
func ByWork(work []float64) []int {
	order := make([]int, len(work))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int {
		switch {
		case work[i] > work[j]:
			return -1
		case work[i] < work[j]:
			return 1
		}
		return 0
	})
	return order
}

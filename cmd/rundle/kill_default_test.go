//go:build unix && !long

package main

const (
	killCount = 5
	killRungs = 12
)

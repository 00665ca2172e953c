//go:build unix && long

package main

const (
	killCount = 50
	killRungs = 24
)

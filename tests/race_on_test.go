//go:build race

package tests

// raceDetector says that the tests run under the race detector, which makes them many times slower.
const raceDetector = true

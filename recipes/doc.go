// Package recipes holds the pages of the lab notebook: one Go file a page. A recipe is an ordinary function that
// takes trials out of the logbook, asks the physics, and puts tables, figures and sentences on a page where they
// arise. `ringbook fit`, `recommend` and `history` print the same pages in the terminal: this is the one place that
// makes a table of results.
//
// It computes nothing of its own: what a loop is and what a network does is package snubber's.
package recipes

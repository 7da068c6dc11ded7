// Package wire puts an Answer into the forms that leave the program: JSON, and
// the columns added to a table. It is the one place that decides how a number is
// rounded and what an absent one looks like, so that every door gives the same
// words and numbers.
//
// Kilometres have two decimals, σ in kilometres one, degrees one, rates in mm/yr
// two, positions four (11 m), the site's own six. NaN, the domain's "absent", is null in JSON and
// empty in a table.
package wire

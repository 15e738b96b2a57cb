// Package chart draws a season as a PNG: the index to date, past seasons at the
// same dates, and the design value.
//
// What differs, differs in line and not only in colour: the season is a thick
// line, the middle of past seasons a dashed one, eight of ten of them a shaded
// band, the design value a line of dots and dashes. The words that say the same
// are the caller's (an alt text); the picture adds nothing that they lack.
//
// It draws with golang.org/x/image (rasteriser, Go fonts) and the standard
// library; a plotting library would bring nine modules more for one picture.
// It is pure: the same item gives the same picture.
package chart

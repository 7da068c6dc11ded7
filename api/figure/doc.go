// Package figure draws answers as SVG 1.1, without a browser or a font at hand.
//
// A figure is 900 px wide. Colours and strokes stand as presentation attributes,
// so that it looks right where style sheets are ignored, on paper and on a light
// screen; a style sheet turns it dark on a screen that asks for that. What a
// colour tells, a pattern of line or fill tells as well. Lengths are measured
// with a table of widths for a wide sans-serif face, so that no text is cut
// whichever face the reader's machine has.
package figure

package figure

import (
	"maps"
	"slices"
	"strings"
)

// look is how a class of elements looks: attributes that hold everywhere, and the
// colours that take their place on a dark screen.
type look struct {
	attrs attrs
	dark  string // declarations of the style sheet
}

// Colours: dark blue, vermilion, green and purple, of which any two differ in
// lightness or in the blue-yellow sense, which all kinds of colour vision tell apart.
var looks = map[string]look{
	"bg":     {attrs{"fill", "#ffffff"}, "fill:#14181d"},
	"ink":    {attrs{"fill", "#1b1f24"}, "fill:#e8ebee"},
	"soft":   {attrs{"fill", "#48525c"}, "fill:#aeb8c1"},
	"grid":   {attrs{"fill", "none", "stroke", "#d9dee3", "stroke-width", "1"}, "stroke:#2b333b"},
	"frame":  {attrs{"fill", "none", "stroke", "#48525c", "stroke-width", "1"}, "stroke:#aeb8c1"},
	"ground": {attrs{"fill", "none", "stroke", "#1b1f24", "stroke-width", "2"}, "stroke:#e8ebee"},
	"lead":   {attrs{"fill", "none", "stroke", "#1b1f24", "stroke-width", "0.8"}, "stroke:#e8ebee"},
	"mark":   {attrs{"fill", "#1b1f24", "stroke", "#ffffff", "stroke-width", "1"}, "fill:#e8ebee;stroke:#14181d"},
	"ring":   {attrs{"fill", "#ffffff", "stroke", "#1b1f24", "stroke-width", "1.5"}, "fill:#14181d;stroke:#e8ebee"},
	"halo":   {attrs{"stroke", "#ffffff", "stroke-width", "4", "stroke-linejoin", "round", "fill", "none"}, "stroke:#14181d"},
	"arc":    {attrs{"fill", "none", "stroke", "#9a6300", "stroke-width", "1"}, "stroke:#e3b75c"},
	"arcbar": {attrs{"fill", "#e3a93c", "stroke", "#9a6300", "stroke-width", "1"}, "fill:#a87a22;stroke:#e3b75c"},
	"slab0":  {attrs{"fill", "none", "stroke", "#0a5a99", "stroke-width", "2.6", "stroke-linejoin", "round"}, "stroke:#6fbaf5"},
	"slab1":  {attrs{"fill", "none", "stroke", "#b8420b", "stroke-width", "2.2", "stroke-linejoin", "round", "stroke-dasharray", "10 4"}, "stroke:#f39a63"},
	"slab2":  {attrs{"fill", "none", "stroke", "#00694f", "stroke-width", "2.2", "stroke-linejoin", "round", "stroke-dasharray", "8 4 2 4"}, "stroke:#58cbaa"},
	"slab3":  {attrs{"fill", "none", "stroke", "#733a99", "stroke-width", "2.2", "stroke-linejoin", "round", "stroke-dasharray", "3 3"}, "stroke:#cba2ea"},
	"band0":  {attrs{"fill", "#0a5a99", "fill-opacity", "0.16", "stroke", "none"}, "fill:#6fbaf5"},
	"band1":  {attrs{"fill", "#b8420b", "fill-opacity", "0.13", "stroke", "none"}, "fill:#f39a63"},
	"band2":  {attrs{"fill", "#00694f", "fill-opacity", "0.13", "stroke", "none"}, "fill:#58cbaa"},
	"band3":  {attrs{"fill", "#733a99", "fill-opacity", "0.13", "stroke", "none"}, "fill:#cba2ea"},
	"edge0":  {attrs{"fill", "none", "stroke", "#0a5a99", "stroke-width", "0.8", "stroke-dasharray", "1 2"}, "stroke:#6fbaf5"},
	"edge1":  {attrs{"fill", "none", "stroke", "#b8420b", "stroke-width", "0.8", "stroke-dasharray", "1 2"}, "stroke:#f39a63"},
	"edge2":  {attrs{"fill", "none", "stroke", "#00694f", "stroke-width", "0.8", "stroke-dasharray", "1 2"}, "stroke:#58cbaa"},
	"edge3":  {attrs{"fill", "none", "stroke", "#733a99", "stroke-width", "0.8", "stroke-dasharray", "1 2"}, "stroke:#cba2ea"},
	"join":   {attrs{"fill", "none", "stroke", "#0a5a99", "stroke-width", "1.6", "stroke-dasharray", "2 5"}, "stroke:#6fbaf5"},
}

// numSlabLooks is how many slabs look different from each other.
const numSlabLooks = 4

// classPrefix keeps the classes apart from those of a page that holds the figure.
const classPrefix = "nm-"

// like returns the attributes of a class, with more after them.
func like(class string, more ...string) attrs {
	l, ok := looks[class]
	if !ok {
		l = mapLooks[class]
	}
	return append(append(attrs{"class", classPrefix + class}, l.attrs...), more...)
}

// styleSheet turns the figure dark where a screen asks for that. On paper it stays
// light.
func styleSheet() string { return darkSheet(looks) }

func darkSheet(of map[string]look) string {
	var b strings.Builder
	b.WriteString("@media screen and (prefers-color-scheme:dark){")
	for _, c := range slices.Sorted(maps.Keys(of)) {
		b.WriteString("." + classPrefix + c + "{" + of[c].dark + "}")
	}
	b.WriteString("}")
	return b.String()
}

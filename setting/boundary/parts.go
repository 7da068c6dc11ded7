package boundary

import "nearmargin/setting/sphere"

// Parts returns the path cut where it crosses ±180°; see
// [sphere.CutAtAntimeridian].
func (b *Boundary) Parts() [][]sphere.LonLat { return sphere.CutAtAntimeridian(b.spec.Path) }

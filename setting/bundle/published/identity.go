package published

import (
	"slices"
	"strings"

	"nearmargin/setting/bundle"
)

const (
	citeBird  = "Bird, P. (2003), An updated digital model of plate boundaries, Geochem. Geophys. Geosyst. 4(3), 1027, doi:10.1029/2001GC000252."
	citeSlab2 = "Hayes, G. P., G. L. Moore, D. E. Portner, M. Hearne, H. Flamme, M. Furtney and G. M. Smoczyk (2018), Slab2, a comprehensive subduction zone geometry model, Science 362, 58-61, doi:10.1126/science.aat4723."
)

// cite notes that a source was read.
func (b *builder) cite(citation, licence string) {
	if citation != "" && !slices.Contains(b.sources, citation) {
		b.sources = append(b.sources, citation)
	}
	if licence != "" && !slices.Contains(b.licences, licence) {
		b.licences = append(b.licences, licence)
	}
}

// identity fills what the request leaves open of the model's identity.
func (b *builder) identity() bundle.Identity {
	i := b.q.Identity
	base := b.q.Base
	if i.ID == "" {
		i.ID = "published"
	}
	if i.Title == "" {
		i.Title = "Model built from published data"
		if base != nil {
			i.Title += ", the rest from " + base.Model.Ref()
		}
	}
	if i.Licence == "" {
		all := slices.Clone(b.licences)
		if base != nil {
			all = append(all, base.Model.Licence()+" ("+base.Model.Ref()+")")
		}
		if i.Licence = strings.Join(all, "; "); i.Licence == "" {
			i.Licence = "that of the files it was built from"
		}
	}
	if len(i.Citations) == 0 {
		i.Citations = slices.Clone(b.sources)
		if base != nil {
			for _, c := range base.Model.Citations() {
				if !slices.Contains(i.Citations, c) {
					i.Citations = append(i.Citations, "For what is kept of "+base.Model.Ref()+": "+c)
				}
			}
		}
	}
	if i.DefaultMotion == "" && base != nil {
		i.DefaultMotion = base.Model.DefaultMotion()
	}
	return i
}

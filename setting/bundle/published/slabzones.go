package published

import "nearmargin/setting/slab"

// slabZone is what the three letters of a zone stand for.
type slabZone struct {
	name string
	kind slab.Kind
}

// slabZones are the zones that Hayes et al. (2018), Slab2, a comprehensive
// subduction zone geometry model, Science 362, 58, doi:10.1126/science.aat4723,
// publish. The kinds are the project's: below the Himalaya, the Hindu Kush and the
// Pamir continents collide.
var slabZones = map[string]slabZone{
	"alu": {"Alaska-Aleutian", slab.Subduction},
	"cal": {"Calabrian", slab.Subduction},
	"cam": {"Central American", slab.Subduction},
	"car": {"Lesser Antilles", slab.Subduction},
	"cas": {"Cascadia", slab.Subduction},
	"cot": {"Cotabato", slab.Subduction},
	"hal": {"Halmahera", slab.Subduction},
	"hel": {"Hellenic", slab.Subduction},
	"him": {"Himalayan", slab.Collision},
	"hin": {"Hindu Kush", slab.Collision},
	"izu": {"Izu-Bonin-Mariana", slab.Subduction},
	"ker": {"Tonga-Kermadec-Hikurangi", slab.Subduction},
	"kur": {"Kamchatka-Kuril-Japan", slab.Subduction},
	"mak": {"Makran", slab.Subduction},
	"man": {"Manila", slab.Subduction},
	"mue": {"Muertos", slab.Subduction},
	"pam": {"Pamir", slab.Collision},
	"phi": {"Philippine", slab.Subduction},
	"png": {"New Guinea", slab.Subduction},
	"puy": {"Puysegur", slab.Subduction},
	"ryu": {"Ryukyu-Nankai", slab.Subduction},
	"sam": {"South American", slab.Subduction},
	"sco": {"South Sandwich", slab.Subduction},
	"sol": {"Solomon Islands", slab.Subduction},
	"sul": {"North Sulawesi", slab.Subduction},
	"sum": {"Sumatra-Java", slab.Subduction},
	"van": {"New Hebrides", slab.Subduction},
}

// arcMinDepthKm is the least depth of a slab's top below a volcanic arc where
// nothing better is known of the slab.
const arcMinDepthKm = 80

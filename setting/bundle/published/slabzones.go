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
	"alu": {"Alaska-Aleutian slab", slab.Subduction},
	"cal": {"Calabrian slab", slab.Subduction},
	"cam": {"Central American slab", slab.Subduction},
	"car": {"Lesser Antilles slab", slab.Subduction},
	"cas": {"Cascadia slab", slab.Subduction},
	"cot": {"Cotabato slab", slab.Subduction},
	"hal": {"Halmahera slab", slab.Subduction},
	"hel": {"Hellenic slab", slab.Subduction},
	"him": {"Himalayan slab", slab.Collision},
	"hin": {"Hindu Kush slab", slab.Collision},
	"izu": {"Izu-Bonin-Mariana slab", slab.Subduction},
	"ker": {"Tonga-Kermadec-Hikurangi slab", slab.Subduction},
	"kur": {"Kamchatka-Kuril-Japan slab", slab.Subduction},
	"mak": {"Makran slab", slab.Subduction},
	"man": {"Manila slab", slab.Subduction},
	"mue": {"Muertos slab", slab.Subduction},
	"pam": {"Pamir slab", slab.Collision},
	"phi": {"Philippine slab", slab.Subduction},
	"png": {"New Guinea slab", slab.Subduction},
	"puy": {"Puysegur slab", slab.Subduction},
	"ryu": {"Ryukyu-Nankai slab", slab.Subduction},
	"sam": {"South American slab", slab.Subduction},
	"sco": {"South Sandwich slab", slab.Subduction},
	"sol": {"Solomon Islands slab", slab.Subduction},
	"sul": {"North Sulawesi slab", slab.Subduction},
	"sum": {"Sumatra-Java slab", slab.Subduction},
	"van": {"New Hebrides slab", slab.Subduction},
}

// arcMinDepthKm is the least depth of a slab's top below a volcanic arc where
// nothing better is known of the slab.
const arcMinDepthKm = 80

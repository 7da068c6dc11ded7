package published

// plateNames are the names of the plates that Bird (2003) counts, and of those
// that later motion models add, under the project's codes.
var plateNames = map[string]string{
	"AM": "Amur", "AN": "Antarctica", "AP": "Altiplano", "AR": "Arabia", "AS": "Aegean Sea",
	"AT": "Anatolia", "AU": "Australia", "BH": "Birds Head", "BR": "Balmoral Reef",
	"BS": "Banda Sea", "BU": "Burma", "CA": "Caribbean", "CL": "Caroline", "CO": "Cocos",
	"CP": "Capricorn", "CR": "Conway Reef", "EA": "Easter", "EU": "Eurasia", "FT": "Futuna",
	"GP": "Galapagos", "IN": "India", "JF": "Juan de Fuca", "JZ": "Juan Fernandez",
	"KE": "Kermadec", "LW": "Lwandle", "MA": "Mariana", "MN": "Manus", "MO": "Maoke",
	"MQ": "Macquarie", "MS": "Molucca Sea", "NA": "North America", "NB": "North Bismarck",
	"ND": "North Andes", "NH": "New Hebrides", "NI": "Niuafo'ou", "NU": "Nubia",
	"NZ": "Nazca", "OK": "Okhotsk", "ON": "Okinawa", "PA": "Pacific", "PM": "Panama",
	"PS": "Philippine Sea", "RI": "Rivera", "SA": "South America", "SB": "South Bismarck",
	"SC": "Scotia", "SL": "Shetland", "SM": "Somalia", "SR": "Sur", "SS": "Solomon Sea",
	"SU": "Sunda", "SW": "Sandwich", "TI": "Timor", "TO": "Tonga", "VI": "Victoria",
	"WL": "Woodlark", "YZ": "Yangtze",
}

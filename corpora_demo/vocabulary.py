"""Names, topics and plain word lists of the invented coast. All people, places and ships are made up."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Author:
    """Someone who writes documents of one genre at one station, in some years (both included)."""

    name: str
    genre: str
    station: str
    first_year: int
    last_year: int


AUTHORS = (
    Author("Tobias Wrenmoor", "log", "Skarrow", 1871, 1880),
    Author("Hester Ambleforth", "log", "Vellan", 1871, 1890),
    Author("Silas Orrelby", "log", "Tarnsay", 1874, 1886),
    Author("Jonah Prestwillow", "log", "Ulsay", 1871, 1884),
    Author("Miriam Cotterhay", "log", "Skarrow", 1881, 1890),
    Author("Edwin Thackerlow", "log", "Brecksay", 1878, 1890),
    Author("Josiah Pellbrook", "notice", "Marraway", 1871, 1882),
    Author("Agnes Farrowby", "notice", "Dunmarrow", 1871, 1890),
    Author("Rupert Hallowick", "notice", "Holmeray", 1875, 1890),
    Author("Cornelius Strand", "notice", "Marraway", 1883, 1890),
    Author("Lavinia Motherwick", "notice", "Finstray", 1871, 1887),
)
STATIONS = tuple(dict.fromkeys(author.station for author in AUTHORS))
HABIT_AUTHOR = "Silas Orrelby"
"""Has a phrase that nobody else uses, in many documents."""

TOPICS: dict[str, dict[str, tuple[str, ...]]] = {
    "log": {
        "birds": ("gannets", "puffins", "cormorants", "fledglings"),
        "wreck": ("timbers", "survivors", "spars", "salvors"),
        "garden": ("potatoes", "hens", "seedlings", "beehives"),
    },
    "notice": {
        "livestock": ("cattle", "drovers", "lambs", "ponies"),
        "regatta": ("oarsmen", "musicians", "yachts", "spectators"),
        "works": ("dredgers", "masons", "barges", "divers"),
    },
}
"""Words that share documents but are drawn independently of one another in every sentence."""

LISTS: dict[str, str] = {
    "MONTH": "January February March April May June July August September October November December",
    "WEEKDAY": "Monday Tuesday Wednesday Thursday Friday Saturday Sunday",
    "HOUR": "one two three four five six seven eight nine ten eleven twelve",
    "SMALL": "two three four five six seven eight nine ten twelve",
    "BIG": "twenty thirty forty fifty sixty eighty ninety",
    "QUARTER": "north south east west north south east west northward southward eastward westward",
    "SHIP": "Marigold Thessaly Perdita Halcyon Brannock Sealark Fidelia Ismay Tamarisk Corriver Evadne Larkspur "
    "Wanderer Constance Dorothea Bellona",
    "FERRY": "Kittiwake Ladybird Meridian Persevere Oystercatcher Primrose Hermione Swiftsure",
    "ISLE": "Skarrow Vellan Tarnsay Ulsay Brecksay Orrinholm Little_Vell Corran_Bar",
    "PORT": "Marraway Dunmarrow Holmeray Finstray Sallowquay Thornhithe Wendle",
    "SURNAME": "Tolland Bracewell Quillan Ferriby Sandlock Mossop Hartnoll Yewdale Kellaby Rudge Penrake Ostler",
    "TRADE": "carpenter blacksmith doctor schoolmaster minister painter glazier cooper sailmaker mason tinsmith "
    "shepherd plumber",
    "LOG_ADJ": "old new spare worn small green large broken rusty narrow wooden upper lower plain clean wet second "
    "ancient useful handsome crooked curious good simple",
    "LOG_NOUN": "bucket ladder stove kettle table lamp barrel spade ledger almanac barometer telescope anvil "
    "bench cupboard mattress basket tarpaulin pulley hammer chisel lamp shutter mirror clock rope mug whistle bell box "
    "cart sieve mallet tray lantern kettle chest saddle wheelbarrow shelf saucepan screw padlock trestle",
    "LOSS": "gutter flagstaff shutters weathercock chimney paling ladder gate boatshed woodpile clothesline rain_gauge "
    "henhouse handrail skylight",
    "TASK_ADJ": "old new upper lower spare worn outer inner main north",
    "GEN_PLACE": "landing tower gallery boathouse cottage lantern slip beacon rocks headland wall yard shore "
    "path jetty",
    "SEA_PLACE": "sound bay channel race reef harbour point shoal skerry narrows",
    "DAY_ADJ": "fine dull mild raw bright gloomy quiet dreary blustery sultry pleasant frosty close",
    "NOTICE_ADJ": "new large small convenient additional special public private comfortable covered handsome usual "
    "separate spacious ordinary green second temporary permanent useful",
    "NOTICE_NOUN": "saloon cabin shed counter platform lamp waiting_room warehouse awning gate booth bench staircase "
    "stable kitchen handcart landing turnstile cloakroom refreshment_room lavatory storehouse weighbridge clock hoist "
    "pump tearoom verandah fountain",
    "NOTICE_PLACE": "warehouse booth waiting_room counter landing gate pier_head north_gate custom_house old_office "
    "lower_platform",
    "PARTY": "directors managers owners harbour_masters superintendents agents inspectors clerks stewards",
    "MANNER": "carefully quickly slowly quietly patiently safely properly twice thoroughly neatly again",
    "GOODS": "butter cheese barley oats timber slate coal salt wool leather flour tobacco herring candles bricks "
    "cider soap lead linen hay",
    "PERSONS": "farmers labourers visitors families scholars soldiers merchants fishermen pilgrims children servants "
    "anglers sailors nurses pupils schoolboys parties_of_ten bachelors tradesmen",
    "DELAY": "fire strike collision broken_shaft cracked_boiler shortage_of_coal shortage_of_hands "
    "general_holiday parish_fair burst_pipe",
    "REASON": "cleaning repair inspection painting survey coaling",
    "REGRET": "regrets laments apologises_for deplores",
    "FOOD": "bread biscuit mutton bacon porridge soup pudding fish broth dumplings",
    "MOOD": "cheerful silent weary thankful sober vexed contented drowsy",
    "BODY_PART": "hand foot shoulder back knee wrist ankle",
}
"""Rule names whose words are equally likely (a word given twice counts twice); an underscore stands for a space."""

NO_AN = frozenset({"useful", "one", "usual", "uniform"})
SILENT_H = frozenset({"hour", "honest"})

BURSTY_PHRASE = "strange green lamp"
"""Repeated in the one talkative document and hardly used elsewhere, though its words are."""

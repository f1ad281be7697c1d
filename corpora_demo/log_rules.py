"""How the keepers write: rules of the logbooks."""

LOG_RULES: dict[str, str] = {
    "LOG_OPENING": """
        3 | log of the light at @station for the month of MONTH .
        2 | @station light , week ending on the first WEEKDAY of MONTH .
        1 | @station , MONTH , all well at the station and the light shown every night .""",
    "LOG_CLOSING": """
        3 | light shown from sunset to sunrise and all well .
        2 | nothing more to report from @station .
        2 | stores counted and the book signed .
        1 | the relief is looked for on WEEKDAY if the sea allows .""",
    "LOG_BODY": """
        40 | LOG_WEATHER
        26 | LOG_TASKS
        13 | LOG_PASSING
        12 | LOG_THINGS
        36 | LOG_TOPIC
        6 | LOG_SUPPLY
        5 | LOG_PEOPLE
        3*habit | by the good grace of the tide we are all well at @station .
        2*habit | LOG_PERSON came back safe , by the good grace of the tide .""",
    "LOG_WEATHER": """
        7 | the day began with a(n) BREEZE from the QUARTER and a(n) SKY .
        4 | a(n) WIND set in from the QUARTER AT_TIME .
        3 | a(n) WIND blew all PART from the QUARTER , with RAIN and a(n) SWELL in the SEA_PLACE .
        4 | FOG came down over the SEA_PLACE AT_TIME and we sounded the horn until CLOCK .
        4 | we had FOG from CLOCK and could not see the GEN_PLACE .
        3 | FOG lay on the water , so that the GEN_PLACE was hidden from us until CLOCK .
        3 | LOG_SUBJECT kept watch with the horn going in FOG until CLOCK .
        2 | thick cloud AT_TIME , and no stars to be seen from the GEN_PLACE .
        1 | thick smoke was seen over PORT AT_TIME , and a dense crowd upon the quay .
        3 | the PART was DAY_ADJ , with FOG about the SEA_PLACE and no air to move it .
        4 | a(n) SWELL ran into the SEA_PLACE and broke upon the GEN_PLACE .
        3 | there was a(n) SEA in the SEA_PLACE and no boat could land .
        3 | RAIN fell AT_TIME and filled the cistern .
        3 | a(n) SQUALL passed over AT_TIME and carried away the LOSS .
        2 | a(n) GALE rose in the PART and blew until CLOCK .
        2 | DAY_ADJ weather , with a(n) BREEZE .
        2 | DAY_ADJ PART , a(n) WIND , and a(n) SEA running .
        2 | the WIND dropped AT_TIME and left a(n) SKY and a(n) SWELL .
        3 | a(n) TIDE ran past the GEN_PLACE , and a(n) WIND from the QUARTER stood against it .
        2 | the CURRENT off the GEN_PLACE carried the float into the SEA_PLACE .
        2 | a DAY_ADJ PART .
        2 | the BREEZE died away AT_TIME and the sea fell smooth .
        3 | a(n) DAY_ADJ PART gave place to a(n) DAY_ADJ one , and the QUARTER cleared at last .
        2 | hail and sleet AT_TIME , so that the panes had to be wiped every hour .
        2 | the barometer stood low AT_TIME , yet nothing came of it but a(n) SKY .
        2 | hard frost ; the GEN_PLACE was white and the pump had to be thawed with hot water .
        1 | lightning seen to the QUARTER AT_TIME , and thunder after it .
        1 | barometer falling , a(n) SKY , and a(n) SWELL from the QUARTER .""",
    "LOG_PERSON": """
        3 | my assistant
        2 | the second keeper
        3 | Mr SURNAME
        2 | young SURNAME
        1 | the watchman""",
    "LOG_SUBJECT": """
        4 | LOG_PERSON
        4 | we
        2 | I
        1 | both keepers""",
    "LOG_TASKS": """
        6 | AT_TIME LOG_SUBJECT TASK .
        8 | LOG_SUBJECT TASK and TASK .
        5 | LOG_SUBJECT TASK AT_TIME , and then TASK before supper .
        4 | LOG_SUBJECT MANNER TASK .
        4 | after breakfast LOG_SUBJECT TASK , while LOG_PERSON TASK .
        3 | LOG_SUBJECT KEEPING , and TASK .
        3 | LOG_SUBJECT KEEPING .
        2 | having put the KEPT to rights , LOG_SUBJECT TASK .
        2 | LOG_SUBJECT kept watch from CLOCK and TASK .
        2 | the SIGNAL were hoisted AT_TIME and answered from the GEN_PLACE .""",
    "KEEPING": """
        1 | kept the KEPT in good order
        1 | kept the KEPT and the KEPT in good order
        1 | kept every TASK_ADJ KEPT_ONE in good order""",
    # The first word is trimmed, wound or polished; one word may stand between, so the pair is loosely windowed.
    "TASK": """
        14 | trimmed THE wick
        3 | trimmed THE lamp
        1 | trimmed THE sails
        8 | polished THE lens
        5 | polished THE brass
        3 | polished THE reflector
        7 | wound THE clockwork
        2 | wound THE chain
        6 | painted THE railing
        4 | painted THE door
        4 | painted THE gallery
        4 | mended THE nets
        4 | mended THE fence
        4 | mended THE roof
        6 | cleaned THE panes
        4 | cleaned THE chimney
        4 | cleaned THE lantern
        4 | greased THE winch
        4 | greased THE hinges
        3 | filled THE cistern
        3 | filled THE lamp with FUEL
        5 | overhauled THE davits of the LAUNCH
        5 | made fast the LOG_NOUN with a strong rope
        4 | hauled up the LAUNCH
        3 | swept THE stairs
        3 | scrubbed THE floor""",
    "THE": """
        6 | the
        4 | the TASK_ADJ
        1 | all of the
        1 | the whole of the""",
    "KEPT": """
        1 | lamps
        1 | pumps
        1 | boats
        1 | tools
        1 | books
        1 | ropes""",
    "KEPT_ONE": """
        1 | lamp
        1 | pump
        1 | ladder
        1 | tool
        1 | rope""",
    "LOG_PASSING": """
        4 | the SHIP passed to the QUARTER AT_TIME under easy sail .
        4 | AT_TIME the VESSEL SHIP was seen off the SEA_PLACE , making for PORT at a(n) PACE .
        3 | the SHIP beat up to the SEA_PLACE in the teeth of the gale and anchored AT_TIME .
        2 | LOG_PERSON rowed out in the teeth of the gale to speak the SHIP .
        3 | a(n) VESSEL showed her SIGNAL and was answered at once .
        3 | SMALL sail in sight , and the VESSEL for PORT went by AT_TIME .
        2 | the SHIP lay to off the SEA_PLACE in a(n) SEA until the LAUNCH could reach her .
        2 | the SHIP drove past in the strong current and was lost to sight behind the GEN_PLACE .
        2 | a large barque stood in from the QUARTER , but bore away when she made out the SEA_PLACE .
        2 | SMALL fishing boats from PORT worked their lines off the SEA_PLACE and gave us a basket of fish .
        2 | LOG_PERSON watched the SHIP through the glass AT_TIME , and judged by her pumps that she was leaking .
        1 | no vessel seen .""",
    "LOG_THINGS": """
        4 | the LOG_ADJ LOG_NOUN in the GEN_PLACE wants a(n) LOG_ADJ LOG_NOUN .
        3 | LOG_SUBJECT made a(n) LOG_ADJ LOG_NOUN for the GEN_PLACE out of a(n) LOG_ADJ LOG_NOUN .
        3 | LOG_SUBJECT found the LOG_NOUN cracked and set up the LOG_ADJ one in its place .
        3 | the LOG_ADJ LOG_NOUN was carried down to the GEN_PLACE AT_TIME .
        2 | a(n) LOG_ADJ LOG_NOUN came ashore near the GEN_PLACE .
        2 | LOG_PERSON left a(n) LOG_ADJ LOG_NOUN and a(n) LOG_ADJ LOG_NOUN at the GEN_PLACE .
        2 | the LOG_NOUN leaks .
        2 | the steam winch at the GEN_PLACE was tried AT_TIME and found sound .
        2 | there is still no LOG_ADJ LOG_NOUN to be had at @station , though LOG_SUBJECT asked for one in MONTH .
        3 | the LOSS was blown down in the PART and LOG_SUBJECT set it up again with new nails and a strong rope .
        1 | the smell of strong tea filled the GEN_PLACE when LOG_PERSON came off watch .""",
    "LOG_SUPPLY": """
        4 | the tender brought SMALL drums of FUEL and a(n) LOG_ADJ LOG_NOUN .
        4 | we burned SMALL gallons of FUEL this week and have BIG in store .
        3 | the FUEL was short by SMALL pints , which I have written to the office .
        2 | received GOODS and GOODS by the LAUNCH AT_TIME .
        2 | the price of FUEL is talked of again at PORT .
        2 | LOG_SUBJECT drew FUEL for SMALL days and locked the store .""",
    "LOG_PEOPLE": """
        3 | a(n) TRADE came over from PORT AT_TIME and stayed SMALL days .
        2 | LOG_PERSON took a(n) brisk walk to the GEN_PLACE before his watch .
        2 | LOG_PERSON was unwell and lay in bed until CLOCK .
        2 | the inspector came off in the LAUNCH and looked over the books .
        2 | had word from PORT that the TRADE has died .
        2 | LOG_PERSON hurt his BODY_PART on the GEN_PLACE and will not be fit for work before WEEKDAY .
        2 | dined on FOOD and FOOD , and all hands were MOOD .
        1 | LOG_PERSON was MOOD after his watch and spoke little .
        1 | wrote home , and sent them over to PORT by the VESSEL .
        1 | LOG_PERSON read aloud to us by the stove .
        1 | we were glad of strong tea and dry clothes .""",
    # The topical nouns are drawn independently: they share documents, and nothing else. Sentences with two of them
    # are as rare as chance would have it.
    "LOG_TOPIC": """
        5 | there were TOPIC_LOG by the GEN_PLACE AT_TIME .
        5 | LOG_PERSON looked to the TOPIC_LOG AT_TIME .
        5 | the TOPIC_LOG took up most of the PART .
        4 | LOG_SUBJECT counted SMALL TOPIC_LOG from the GEN_PLACE , and MANNER wrote the number down .
        4 | SMALL TOPIC_LOG more , and LOG_PERSON says that all will do well .
        4 | a(n) TRADE from PORT came to see the TOPIC_LOG and went back by the VESSEL .
        4 | had a letter about the TOPIC_LOG , which I answered AT_TIME .
        4 | LOG_PERSON is MOOD on account of the TOPIC_LOG .
        3 | the weather was hard upon the TOPIC_LOG near the GEN_PLACE .
        3 | after supper LOG_SUBJECT spoke of the TOPIC_LOG and of little else .
        3 | no change in the TOPIC_LOG .
        2.1 | LOG_SUBJECT MANNER looked over the TOPIC_LOG and the TOPIC_LOG AT_TIME .
        2.1 | the TOPIC_LOG and the TOPIC_LOG are much spoken of at PORT .""",
    "TOPIC_LOG": """
        topic_birds | TOPIC_BIRDS
        topic_wreck | TOPIC_WRECK
        topic_garden | TOPIC_GARDEN""",
    "LOG_BURST": """
        5 | LOG_SUBJECT saw the strange green lamp again AT_TIME .
        3 | the strange green lamp burned off the SEA_PLACE until CLOCK .
        2 | LOG_PERSON says that the strange green lamp is no vessel .
        1 | no one at PORT will own to a strange green lamp .""",
}

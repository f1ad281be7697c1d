"""How the ferry company writes: rules of the notices."""

NOTICE_RULES: dict[str, str] = {
    "NOTICE_OPENING": """
        3 | notice to passengers from the office at @station , MONTH .
        2 | the company begs to inform the public of PORT and @station of the arrangements for MONTH .
        1 | by order of the PARTY , @station , the first WEEKDAY of MONTH .""",
    "NOTICE_CLOSING": """
        3 | by order of the PARTY , at the office in @station .
        2 | further particulars may be had at the office in @station .
        1 | all earlier notices are withdrawn .""",
    "NOTICE_BODY": """
        24 | SAILINGS
        25 | NOTICE_WEATHER
        15 | FARES
        16 | NOTICE_THINGS
        12 | CARRIAGE
        36 | NOTICE_TOPIC
        8 | CONDUCT
        5 | NOTICE_FUEL""",
    "SAILINGS": """
        4 | the VESSEL FERRY will leave PORT for ISLE AT_TIME , weather and other circumstances permitting .
        4 | until further notice the FERRY will call at PORT on WEEKDAY and at PORT on WEEKDAY .
        3 | the VESSEL for ISLE will not sail on WEEKDAY .
        3 | passengers for ISLE will be landed by the LAUNCH AT_TIME .
        3 | the FERRY makes the crossing to PORT in SMALL hours , the swiftest of any VESSEL on the coast .
        3 | a(n) PASSAGE is promised to all who travel by the VESSEL from PORT .
        2 | the last VESSEL leaves ISLE at CLOCK and waits for no one .
        2 | on WEEKDAY the FERRY takes the place of the FERRY between PORT and PORT .
        3 | the FERRY is laid up for REASON , and her place will be filled by a smaller VESSEL until the end of MONTH .
        3 | owing to a(n) DELAY at PORT there were no sailings on WEEKDAY , and the company REGRET the loss of time .
        2 | those who wish to go on to ISLE the same day should take the VESSEL that leaves AT_TIME .
        2 | PERSONS travelling to ISLE are advised to be on board by CLOCK , since the FERRY will start punctually .
        2 | extra sailings to PORT will be given in MONTH .
        2 | until further notice the LAUNCH will ply between PORT and the NOTICE_PLACE every half hour .""",
    "PASSAGE": """
        40 | swift passage
        30 | cheap passage
        20 | comfortable passage
        10 | safe passage""",
    "NOTICE_WEATHER": """
        5 | should FOG delay the FERRY , passengers will be told by bell at the NOTICE_PLACE .
        5 | in FOG the VESSEL will lie at PORT until it is safe to proceed .
        4 | owing to FOG the VESSEL of last WEEKDAY did not reach ISLE before CLOCK .
        3 | FOG stopped all traffic at PORT from CLOCK , and the company regrets the delay to PERSONS .
        3 | in a(n) WIND from the QUARTER the FERRY will land at PORT instead of ISLE .
        3 | the CURRENT at PORT being what it is , small boats must keep clear of the FERRY .
        3 | owing to a(n) SWELL at ISLE no cargo was landed AT_TIME .
        2 | the TIDE and RAIN of last WEEKDAY have damaged the NOTICE_NOUN at PORT .
        2 | a(n) SQUALL broke the SIGNAL of the FERRY , and a(n) WIND kept her at PORT .
        4 | in a(n) BREEZE or a(n) calm sea the NOTICE_ADJ NOTICE_NOUN will be open to all .
        2 | the FERRY came home from ISLE in the teeth of the gale and nobody was hurt .
        4 | the steam whistle of the FERRY will be blown SMALL times before she leaves PORT .
        2 | the SIGNAL at PORT will be shown whenever the VESSEL is delayed .""",
    "FARES": """
        4 | the fare from PORT to ISLE is SMALL pence , and for children half .
        3 | return tickets at SMALL shillings are sold at the NOTICE_PLACE from CLOCK .
        3 | the fare for PERSONS has been raised to SMALL pence .
        3 | season tickets for PERSONS and PERSONS may be bought at the NOTICE_PLACE in PORT .
        2 | no fare is asked of PERSONS who come with a(n) TRADE .
        2 | there has been a strong demand for cheap tickets to ISLE .
        2 | PERSONS over sixty pay SMALL pence less , on showing a letter from the minister of their parish .
        2 | on WEEKDAY a ticket to ISLE and back may be had for SMALL shillings , a meal of FOOD and FOOD included .
        1 | fares must be paid on board .""",
    "NOTICE_THINGS": """
        4 | a(n) NOTICE_ADJ NOTICE_NOUN has been set up at PORT for the use of PERSONS .
        4 | the NOTICE_ADJ NOTICE_NOUN of the FERRY is reserved for PERSONS .
        3 | the company has built a(n) NOTICE_ADJ NOTICE_NOUN and a(n) NOTICE_ADJ NOTICE_NOUN at PORT .
        3 | PERSONS will find the NOTICE_NOUN beside the NOTICE_ADJ NOTICE_NOUN .
        2 | the NOTICE_NOUN will be closed AT_TIME while a(n) NOTICE_ADJ NOTICE_NOUN is fitted .
        2 | stewards keep the NOTICE_NOUN in good order .
        2 | our men keep the NOTICE_NOUN and the NOTICE_NOUN in good order .
        2 | thanks are due to Mr SURNAME for the gift of a(n) NOTICE_ADJ NOTICE_NOUN .""",
    "CARRIAGE": """
        4 | LOAD for ISLE must be at the NOTICE_PLACE by CLOCK .
        3 | GOODS and GOODS are carried at SMALL shillings the ton .
        3 | the company takes no charge of LOAD left at the NOTICE_PLACE .
        2 | strong boxes may be hired for GOODS .
        2 | there is a(n) TRADING in GOODS between PORT and ISLE , and the VESSEL is often full .
        2 | LOAD will be sent on by the next VESSEL with the utmost care and attention .
        1 | strong cases are wanted at PORT .""",
    # Heavy keeps other company here than in the logbooks, and so does light.
    "LOAD": """
        38 | heavy luggage
        20 | heavy goods
        24 | light luggage
        18 | fragile goods""",
    "TRADING": """
        60 | brisk trade
        25 | steady trade
        15 | growing trade""",
    "CONDUCT": """
        3 | passengers are asked to keep the gangway clear and to walk at a(n) PACE .
        3 | every complaint is heard by the PARTY with the utmost care and attention .
        2 | smoking is forbidden near the NOTICE_PLACE .
        2 | light refreshments are served from CLOCK near the NOTICE_PLACE .
        2 | a(n) TRADE and a(n) TRADE are wanted at PORT ; apply to Mr SURNAME at the NOTICE_PLACE .
        2 | the company rewards with SMALL shillings whoever gives the name of the person who broke the LOSS at PORT .
        2 | PERSONS and PERSONS are reminded that nobody may cross the NOTICE_PLACE while the FERRY comes alongside .
        1 | a brown umbrella left on the FERRY may be claimed at PORT .
        1 | dogs must be led .""",
    "NOTICE_FUEL": """
        3 | the lamps of the FERRY now burn FUEL , and PERSONS are warned not to touch them .
        2 | tenders are invited for BIG barrels of FUEL , delivered at PORT .
        2 | FUEL is not to be carried with GOODS .""",
    # As in the logbooks: drawn independently, two of them together only as often as chance would have it.
    "NOTICE_TOPIC": """
        5 | the FERRY will bring TOPIC_NOTICE to ISLE AT_TIME .
        5 | room for the TOPIC_NOTICE will be made at the NOTICE_PLACE .
        5 | PERSONS must keep away from the TOPIC_NOTICE at PORT .
        5 | the TOPIC_NOTICE are expected at PORT on WEEKDAY .
        4 | BIG TOPIC_NOTICE crossed to ISLE last WEEKDAY without any mishap .
        4 | a(n) TRADE is wanted to help with the TOPIC_NOTICE AT_TIME .
        4 | no more TOPIC_NOTICE can be received at PORT before MONTH .
        4 | the PARTY thank Mr SURNAME for his trouble with the TOPIC_NOTICE .
        3 | all charges for the TOPIC_NOTICE will be paid at the NOTICE_PLACE .
        3 | questions about the TOPIC_NOTICE should be put to the PARTY in writing .
        1.8 | the PARTY have agreed that the TOPIC_NOTICE and the TOPIC_NOTICE may stay at PORT .
        1.8 | on WEEKDAY TOPIC_NOTICE and TOPIC_NOTICE will be landed first .""",
    "TOPIC_NOTICE": """
        topic_livestock | TOPIC_LIVESTOCK
        topic_regatta | TOPIC_REGATTA
        topic_works | TOPIC_WORKS""",
}

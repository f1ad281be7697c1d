"""Rules that both genres use: weather with the company its nouns keep, times and the words that give way to others."""

COMMON_RULES: dict[str, str] = {
    # Nouns with the company they keep. Strong is frequent and fog is frequent, but fog is thick, never strong.
    "WIND": """
        38 | strong wind
        10 | bitter wind
        10 | cold wind
        12 | steady wind
        10 | rising wind
        6 | brisk wind
        8 | fair wind
        6 | contrary wind""",
    "FOG": """
        62 | thick fog
        16 | dense fog
        6 | white fog
        8 | cold fog
        7 | drifting fog
        1 | heavy fog""",
    "BREEZE": """
        30 | light breeze
        30 | brisk breeze
        14 | gentle breeze
        12 | fresh breeze
        8 | pleasant breeze
        6 | steady breeze""",
    "SWELL": """
        64 | heavy swell
        18 | long swell
        10 | slow swell
        8 | ugly swell""",
    "SEA": """
        22 | heavy sea
        28 | rough sea
        20 | confused sea
        14 | calm sea
        16 | smooth sea""",
    "RAIN": """
        42 | heavy rain
        22 | cold rain
        16 | steady rain
        20 | driving rain""",
    "SQUALL": """
        45 | sudden squall
        30 | sharp squall
        25 | heavy squall""",
    "GALE": """
        40 | hard gale
        30 | furious gale
        20 | winter gale
        10 | long gale""",
    # Brisk and swift mean much the same and keep different company; only 'pace' and 'walk' take either.
    "TIDE": """
        40 | swift tide
        36 | strong tide
        14 | spring tide
        10 | falling tide""",
    "CURRENT": """
        44 | swift current
        46 | strong current
        10 | treacherous current""",
    "PACE": """
        30 | brisk pace
        30 | swift pace
        25 | slow pace
        15 | steady pace""",
    "SKY": """
        32 | grey sky
        32 | clear sky
        18 | leaden sky
        18 | pale sky""",
    # One word giving way to another, year by year; and a pair that strengthens.
    "FUEL": """
        paraffin | paraffin
        not_paraffin | oil""",
    "VESSEL": """
        steamer | steamer
        not_steamer | packet""",
    "LAUNCH": """
        steam_launch | steam launch
        0.7*not_steam_launch | whale launch
        0.3*not_steam_launch | rowing launch""",
    "SIGNAL": """
        signal_flags | signal flags
        not_signal_flags | signal lamps""",
    "CLOCK": """
        5 | HOUR o'clock
        2 | half past HOUR
        1 | noon
        1 | midnight""",
    "PART": """
        3 | morning
        3 | afternoon
        3 | evening
        2 | night
        1 | forenoon""",
    "AT_TIME": """
        3 | at CLOCK
        2 | in the PART
        1 | before CLOCK
        1 | towards CLOCK
        1 | shortly after CLOCK
        2 | on WEEKDAY
        1 | soon after CLOCK
        2 | at the turn of the tide""",
}

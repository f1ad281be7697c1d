"""The tables of a store as readable SQL; ``docs/file-format.md`` describes each.

Numbers that a wrong answer could come from stand in checksummed blobs
(:mod:`colloc.store.database.packing`, :mod:`colloc.store.pages`); the columns beside
them are for people with an SQL prompt.
"""

from __future__ import annotations

APPLICATION_ID = 0x434F4C43
"""``COLC``: what SQLite keeps in bytes 68..71 of the file."""

SCHEMA_VERSION = 3
"""Kept as ``user_version``; raised by each migration step."""

PAGE_SIZE = 16384
"""Bytes a page. Blobs of 0.3 to 4 MB are written a third faster than with 4096 (50 MB in WAL mode:
0.16 s against 0.25 s); 65536 would save 0.05 s more and cost every small store over a megabyte."""

INITIAL = (
    """
    CREATE TABLE facts (
        key TEXT PRIMARY KEY,
        value TEXT NOT NULL
    ) WITHOUT ROWID
    """,
    """
    CREATE TABLE sources (
        id INTEGER PRIMARY KEY,
        name TEXT NOT NULL UNIQUE,
        size INTEGER NOT NULL,      -- bytes on disk, -1 where unknown
        modified REAL NOT NULL,     -- seconds since the epoch, 0 where unknown
        digest TEXT,                -- blake2b-128 of the raw bytes, once read to the end
        records INTEGER NOT NULL,   -- documents finished so far
        finished INTEGER NOT NULL   -- 1 when read to the end
    )
    """,
    """
    CREATE TABLE documents (
        id INTEGER PRIMARY KEY AUTOINCREMENT,
        identifier TEXT NOT NULL UNIQUE,
        source INTEGER NOT NULL,
        record INTEGER NOT NULL,
        first_token INTEGER NOT NULL,
        n_tokens INTEGER NOT NULL,
        first_character INTEGER NOT NULL,
        n_characters INTEGER NOT NULL,
        metadata TEXT NOT NULL      -- a JSON object
    )
    """,
    """
    CREATE TABLE types (
        id INTEGER PRIMARY KEY,     -- in order of first appearance, from 0
        form TEXT NOT NULL,         -- NFC
        lemma TEXT NOT NULL,        -- empty for plain text
        upos TEXT NOT NULL          -- empty for plain text
    )
    """,
    """
    CREATE TABLE layers (
        id INTEGER PRIMARY KEY,
        name TEXT NOT NULL UNIQUE,
        terms INTEGER NOT NULL,     -- how many terms it has
        types INTEGER NOT NULL,     -- how many types are mapped
        same INTEGER NOT NULL       -- 1: term = type, the texts are the forms in types
    )
    """,
    """
    CREATE TABLE terms (
        layer INTEGER NOT NULL,
        id INTEGER NOT NULL,
        text TEXT NOT NULL,
        PRIMARY KEY (layer, id)
    ) WITHOUT ROWID
    """,
    """
    CREATE TABLE layer_maps (
        layer INTEGER NOT NULL,
        part INTEGER NOT NULL,      -- 65,536 types each
        data BLOB NOT NULL,         -- packed uint32: type -> term
        PRIMARY KEY (layer, part)
    )
    """,
    """
    CREATE TABLE word_counts (
        id INTEGER PRIMARY KEY,
        layer INTEGER NOT NULL,
        n INTEGER NOT NULL,
        numbers BLOB NOT NULL,      -- packed uint32, ascending
        tokens BLOB NOT NULL,       -- packed int64, signed: a reader adds up the runs
        documents BLOB NOT NULL     -- packed int64, signed
    )
    """,
    """
    CREATE TABLE blocks (
        id INTEGER PRIMARY KEY,
        first_token INTEGER NOT NULL,
        n_tokens INTEGER NOT NULL,
        continues INTEGER NOT NULL, -- 1: the first token goes on inside a sentence
        head_checksum INTEGER NOT NULL,
        types BLOB NOT NULL,        -- packed uint32, ascending: the types present
        sentences BLOB NOT NULL,
        paragraphs BLOB NOT NULL,
        document_starts BLOB NOT NULL,
        document_numbers BLOB NOT NULL,
        anchor_tokens BLOB NOT NULL,
        anchor_characters BLOB NOT NULL,
        tokens BLOB NOT NULL        -- packed uint32
    )
    """,
    """
    CREATE TABLE block_columns (
        block INTEGER NOT NULL,
        name TEXT NOT NULL,
        data BLOB NOT NULL,
        PRIMARY KEY (block, name)
    )
    """,
    """
    CREATE TABLE text_blocks (
        first_character INTEGER PRIMARY KEY,
        n_characters INTEGER NOT NULL,
        data BLOB NOT NULL          -- packed UTF-8
    )
    """,
    """
    CREATE TABLE tallies (
        id INTEGER PRIMARY KEY,
        spec TEXT NOT NULL UNIQUE,  -- a JSON object
        kept INTEGER NOT NULL,      -- 1: asked for by the user, 0: may be dropped
        bytes INTEGER NOT NULL,
        last_used INTEGER NOT NULL  -- seconds since the epoch
    )
    """,
    """
    CREATE TABLE tally_runs (
        id INTEGER PRIMARY KEY,
        tally INTEGER NOT NULL REFERENCES tallies(id),
        base INTEGER NOT NULL,      -- 1: the table as counted, 0: a signed change of it
        summary BLOB NOT NULL,      -- packed int64: total, pairs, margin parts
        low_directory BLOB NOT NULL,
        high_directory BLOB NOT NULL
    )
    """,
    """
    CREATE TABLE tally_pages (
        run INTEGER NOT NULL REFERENCES tally_runs(id),
        ordering INTEGER NOT NULL,  -- 0: sorted by (low, high), 1: by (high, low)
        page INTEGER NOT NULL,
        data BLOB NOT NULL,
        PRIMARY KEY (run, ordering, page)
    )
    """,
    """
    CREATE TABLE margin_pages (
        run INTEGER NOT NULL REFERENCES tally_runs(id),
        part INTEGER NOT NULL,
        numbers BLOB NOT NULL,      -- packed uint32, ascending
        first BLOB NOT NULL,        -- packed int64: row sums
        second BLOB NOT NULL,       -- packed int64: column sums
        PRIMARY KEY (run, part)
    )
    """,
    """
    CREATE TABLE content_hashes (
        digest BLOB PRIMARY KEY,    -- blake2b-128 of a document's or paragraph's text, where repeats are dropped
        document INTEGER NOT NULL   -- where it was met first
    ) WITHOUT ROWID
    """,
    "CREATE INDEX blocks_by_token ON blocks (first_token)",
    "CREATE INDEX documents_by_token ON documents (first_token)",
    "CREATE INDEX word_counts_by_layer ON word_counts (layer)",
    "CREATE INDEX tally_runs_by_tally ON tally_runs (tally)",
    "INSERT INTO layers (id, name, terms, types, same) VALUES (0, 'form', 0, 0, 1)",
    f"PRAGMA application_id = {APPLICATION_ID}",
    "PRAGMA user_version = 1",
)

ANNOTATIONS = (
    """
    CREATE TABLE annotation_values (
        name TEXT NOT NULL,         -- column of block_columns
        id INTEGER NOT NULL,        -- what the column holds
        value TEXT NOT NULL,        -- what it stands for
        PRIMARY KEY (name, id)
    ) WITHOUT ROWID
    """,
    """
    CREATE TABLE annotation_rests (
        document INTEGER NOT NULL,
        block INTEGER NOT NULL,
        data BLOB NOT NULL,         -- packed UTF-8: a JSON object
        PRIMARY KEY (document, block)
    )
    """,
    "PRAGMA user_version = 3",
)

VOCABULARY_INDEXES = (
    "CREATE UNIQUE INDEX IF NOT EXISTS types_by_form ON types (form, lemma, upos)",
    "CREATE INDEX IF NOT EXISTS terms_by_text ON terms (layer, text)",
)
"""Made when a first build has finished its vocabulary: sorting once is faster than keeping order all along."""

DECISIONS = (
    """
    CREATE TABLE decisions (
        id INTEGER PRIMARY KEY AUTOINCREMENT,   -- in the order in which they came into this store
        layer TEXT NOT NULL,
        kind TEXT NOT NULL,         -- pair, directed or expression
        words TEXT NOT NULL,        -- a JSON array of the words' texts
        verdict TEXT NOT NULL,      -- accept, reject, unsure or withdrawn
        sense TEXT NOT NULL,
        note TEXT NOT NULL,
        labels TEXT NOT NULL,       -- a JSON array of texts
        examples TEXT NOT NULL,     -- a JSON array of objects: document, start, text, marks
        judge TEXT NOT NULL,
        decided TEXT NOT NULL       -- ISO 8601, UTC
    )
    """,
    "PRAGMA user_version = 2",
)
"""Rows are only ever added; the newest of a judge on the same words counts."""

"""Tables of a store of version 1, as they were made on 2026-12-01; frozen, so that old stores stay readable."""

VERSION_1 = """
CREATE TABLE ehmo_store (name TEXT PRIMARY KEY, value TEXT NOT NULL);
CREATE TABLE structures (id INTEGER PRIMARY KEY, "key" TEXT, "status" TEXT, "message" TEXT, "source" TEXT,
"entry" TEXT, "tags" TEXT, "program_version" TEXT, "document_schema" TEXT, "results_edition" BIGINT,
"parameter_set" TEXT, "parameter_sha256" TEXT, "platform" TEXT, "started_utc" TEXT, "duration_s" DOUBLE
PRECISION, "formula" TEXT, "metals" TEXT, "atoms" BIGINT, "charge" BIGINT, "unpaired_electrons" BIGINT,
"oxidation_state" BIGINT, "d_count" BIGINT, "point_group" TEXT, "ground_term" TEXT, "first_band_per_cm" DOUBLE
PRECISION, "energy_eV" DOUBLE PRECISION, "gap_eV" DOUBLE PRECISION, "bonds" BIGINT, "warnings" BIGINT);
CREATE TABLE bonds (id INTEGER, place INTEGER, "bond" TEXT, "metal" TEXT, "donor" TEXT, "kind" TEXT,
"length_A" DOUBLE PRECISION, "bond_valence" DOUBLE PRECISION, "overlap_population" DOUBLE PRECISION, "mayer"
DOUBLE PRECISION, "wiberg" DOUBLE PRECISION, "formal_order" DOUBLE PRECISION, "sigma_weight" DOUBLE PRECISION,
"pi_weight_1" DOUBLE PRECISION, "pi_weight_2" DOUBLE PRECISION, "metal_charge" DOUBLE PRECISION,
"donor_charge" DOUBLE PRECISION, PRIMARY KEY (id, place));
CREATE TABLE documents (id INTEGER PRIMARY KEY, document BLOB NOT NULL);
CREATE UNIQUE INDEX structures_by_key ON structures (key);
INSERT INTO ehmo_store (name, value) VALUES ('version', '1');
"""

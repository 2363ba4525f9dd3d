PRAGMA application_id = 1129267540;
PRAGMA user_version = 3;
BEGIN TRANSACTION;
CREATE TABLE cached_results (
    result_key TEXT NOT NULL PRIMARY KEY, -- SHA-256 of all that the result was computed from
    result BLOB NOT NULL
, sha256 TEXT NOT NULL DEFAULT '') STRICT;
CREATE TABLE campaign (
    campaign_id TEXT NOT NULL PRIMARY KEY,
    title TEXT NOT NULL CHECK (title <> ''),
    remark TEXT NOT NULL DEFAULT ''
, laboratory TEXT NOT NULL DEFAULT '', customer TEXT NOT NULL DEFAULT '', order_number TEXT NOT NULL DEFAULT '', author TEXT NOT NULL DEFAULT '', reviewer TEXT NOT NULL DEFAULT '', standards TEXT NOT NULL DEFAULT '[]') STRICT;
INSERT INTO "campaign" VALUES('c1','Salt and patience','Cabinet 3','Own laboratory','A customer','2026-17','AB','CD','["ISO 16773-2", "ISO 4628-2"]');
CREATE TABLE formulations (
    formulation_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    name TEXT NOT NULL UNIQUE CHECK (name <> ''),
    remark TEXT NOT NULL DEFAULT ''
) STRICT;
INSERT INTO "formulations" VALUES('f1',0,'Grey','first batch');
INSERT INTO "formulations" VALUES('f2',1,'Blau ''Ü''; DROP','');
INSERT INTO "formulations" VALUES('f3',2,'empty one','');
CREATE TABLE history (
    entry_id INTEGER PRIMARY KEY AUTOINCREMENT,
    action TEXT NOT NULL CHECK (action IN ('create', 'edit', 'undo', 'redo')),
    of_entry INTEGER REFERENCES history,
    name TEXT NOT NULL,
    who TEXT NOT NULL,
    when_utc TEXT NOT NULL,
    changes TEXT NOT NULL -- JSON: [{"table", "key", "before", "after"}]
, reason TEXT NOT NULL DEFAULT '', state TEXT NOT NULL DEFAULT '', chain TEXT NOT NULL DEFAULT '') STRICT;
INSERT INTO "history" VALUES(1,'create',NULL,'Create the campaign','operator','2026-12-01T17:56:38Z','[]','','9fab6e9aef4c2c02f3a2c415ec1b0d0738d907b8f1857f1f237abd848c6fd566','fa60e8499ce6e0f5a32ceb93ffcb3878454b17a7f91810596acd6f32b5cfa2a5');
INSERT INTO "history" VALUES(2,'edit',NULL,'Change area of panel A1','operator','2026-12-01T17:56:38Z','[{"table": "panels", "key": "p1", "before": {"area_cm2": 10.1}, "after": {"area_cm2": 12.0}}]','','8a37473c50e99837360037cbbd0aef01715775d03f333006c066bcb5ebb97be0','6299c9aa2809303f131ccbb23a0de66c41b193d19088841b326f398f33ae5a71');
CREATE TABLE open_lead (
    campaign_id TEXT NOT NULL PRIMARY KEY
        REFERENCES campaign DEFERRABLE INITIALLY DEFERRED,
    spectrum_id TEXT NOT NULL
        REFERENCES spectra DEFERRABLE INITIALLY DEFERRED,
    file TEXT,
    sha256 TEXT,
    part TEXT,
    dialect TEXT
) STRICT;
INSERT INTO "open_lead" VALUES('c1','d9c9a589e503de701ea23037b4f4d4d76a0175d1d630520cc5d6bed1ae8d7fbb','open_lead.txt','0f933152c536c441412779c57478385f4074033d2f63556b86192723d6924386','','{"encoding": "utf-16", "delimiter": ";", "decimal_sign": ",", "first_data_line": 3, "ascending": true, "columns": [{"position": 0, "heading": "Frequenz/kHz", "role": "frequency", "unit": "kHz", "factor": 1000.0}, {"position": 2, "heading": "−Z″", "role": "imaginary", "unit": "MΩ", "factor": -1000000.0}], "remarks": ["Lines 1–2 were skipped."]}');
CREATE TABLE panels (
    panel_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    name TEXT NOT NULL UNIQUE CHECK (name <> ''),
    formulation_id TEXT NOT NULL
        REFERENCES formulations DEFERRABLE INITIALLY DEFERRED,
    area_cm2 REAL CHECK (area_cm2 > 0),
    thickness_um REAL CHECK (thickness_um > 0),
    substrate TEXT NOT NULL DEFAULT '',
    electrolyte TEXT NOT NULL DEFAULT '',
    temperature_c REAL,
    regime TEXT NOT NULL DEFAULT '',
    remark TEXT NOT NULL DEFAULT '',
    notes TEXT NOT NULL DEFAULT '[]' -- JSON: [[heading, text]]
) STRICT;
INSERT INTO "panels" VALUES('p1',0,'A1','f1',12.0,62.5,'steel','3.5 % NaCl',23.0,'ISO','x','[["Lot", "7"]]');
INSERT INTO "panels" VALUES('p2',1,'B-2','f2',NULL,NULL,'','',NULL,'','','[]');
CREATE TABLE photographs (
    photograph_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL CHECK (exposure_h >= 0),
    sha256 TEXT NOT NULL -- of the bytes in raw_files
        REFERENCES raw_files DEFERRABLE INITIALLY DEFERRED,
    media_type TEXT NOT NULL CHECK (media_type IN ('image/png', 'image/jpeg')),
    caption TEXT NOT NULL DEFAULT '',
    file TEXT NOT NULL DEFAULT ''
) STRICT;
INSERT INTO "photographs" VALUES('b1',0,'p1',168.0,'a1abfd410973b0111c215baa879b9edcd739e601659ba44168269767cc2e9108','image/png','blisters, lower edge','7.png');
CREATE TABLE ratings (
    rating_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL NOT NULL CHECK (exposure_h >= 0),
    scale TEXT NOT NULL CHECK (scale <> ''), -- id of a scale in resources/ratings.toml
    grade TEXT NOT NULL CHECK (grade <> ''), -- as that scale writes it
    edition TEXT NOT NULL DEFAULT '',
    rater TEXT NOT NULL DEFAULT '',
    remark TEXT NOT NULL DEFAULT ''
) STRICT;
INSERT INTO "ratings" VALUES('v1',0,'p1',168.0,'iso_4628_2','2(S3)','2016','AB','edge');
INSERT INTO "ratings" VALUES('v2',1,'p2',0.0,'astm_d610','9-S','','','');
CREATE TABLE raw_files (
    sha256 TEXT NOT NULL PRIMARY KEY,
    bytes BLOB NOT NULL -- the imported file, unchanged
) STRICT;
INSERT INTO "raw_files" VALUES('874926c042d860cfe6819219de62393bbe3d8f56052ee83c5952daffc6223db9',X'66696C6520300D0A00FF');
INSERT INTO "raw_files" VALUES('031638b511ad7ca839c807580ae4af4fffb3b99509a305c91e4573c1f5e44fb1',X'66696C6520310D0A00FF');
INSERT INTO "raw_files" VALUES('c76d646e41be2b31704d88abf8ba08eac6305db1a671741f70fa4e25d6531981',X'66696C6520320D0A00FF');
INSERT INTO "raw_files" VALUES('0f933152c536c441412779c57478385f4074033d2f63556b86192723d6924386',X'66696C6520330D0A00FF');
INSERT INTO "raw_files" VALUES('a1abfd410973b0111c215baa879b9edcd739e601659ba44168269767cc2e9108',X'89504E470D0A1A0A0000000D49484452000000010000000108000000003A7E9B550000000A49444154789C636800000082008177CD72B60000000049454E44AE426082');
CREATE TABLE readings (
    reading_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL NOT NULL CHECK (exposure_h >= 0),
    spectrum_id TEXT NOT NULL
        REFERENCES spectra DEFERRABLE INITIALLY DEFERRED,
    file TEXT NOT NULL,
    sha256 TEXT NOT NULL, -- of the bytes in raw_files
    part TEXT NOT NULL DEFAULT '',
    dialect TEXT, -- JSON: how the file's columns were read
    temperature_c REAL,
    amplitude_mv REAL,
    potential_mv REAL,
    remark TEXT NOT NULL DEFAULT '',
    left_out TEXT NOT NULL DEFAULT '[]', -- JSON: [[point, reason]], points count from 0
    kept_in TEXT NOT NULL DEFAULT '[]', -- JSON: [point]
    pinned_model TEXT NOT NULL DEFAULT '',
    overruled_because TEXT NOT NULL DEFAULT ''
, temperature_low_c REAL, temperature_high_c REAL, potential_low_mv REAL, potential_high_mv REAL) STRICT;
INSERT INTO "readings" VALUES('r1',0,'p1',3.00000000000000044408e-01,'c78e984090c96c59de651ce68a38dce01c1034b917bd3eefd6448a52982db276','one/a1.csv','874926c042d860cfe6819219de62393bbe3d8f56052ee83c5952daffc6223db9','sheet 2','{"encoding": "utf-16", "delimiter": ";", "decimal_sign": ",", "first_data_line": 3, "ascending": true, "columns": [{"position": 0, "heading": "Frequenz/kHz", "role": "frequency", "unit": "kHz", "factor": 1000.0}, {"position": 2, "heading": "−Z″", "role": "imaginary", "unit": "MΩ", "factor": -1000000.0}], "remarks": ["Lines 1–2 were skipped."]}',22.5,20.0,-431.7,'a drop under the cell
wiped','[[0, "spike"], [4, "drift"]]','[2]','film_with_pores','repeated, same answer',22.1,22.9,-440.25,-428.0);
INSERT INTO "readings" VALUES('r2',1,'p1',168.0,'6d890be02099271188f84ea89d5b1244d1d6bcad1643498778f45f57f334b98a','a1 168.csv','031638b511ad7ca839c807580ae4af4fffb3b99509a305c91e4573c1f5e44fb1','',NULL,NULL,NULL,NULL,'','[]','[]','','',NULL,NULL,NULL,NULL);
INSERT INTO "readings" VALUES('r3',2,'p2',168.0,'49135cbe551647b00c9c416c875c4a85a7b015082f70ed936a72ce8ff243037c','b2.csv','c76d646e41be2b31704d88abf8ba08eac6305db1a671741f70fa4e25d6531981','t=168','{"encoding": "utf-16", "delimiter": ";", "decimal_sign": ",", "first_data_line": 3, "ascending": true, "columns": [{"position": 0, "heading": "Frequenz/kHz", "role": "frequency", "unit": "kHz", "factor": 1000.0}, {"position": 2, "heading": "−Z″", "role": "imaginary", "unit": "MΩ", "factor": -1000000.0}], "remarks": ["Lines 1–2 were skipped."]}',NULL,NULL,NULL,'','[]','[]','','',NULL,NULL,NULL,NULL);
INSERT INTO "readings" VALUES('r4',3,'p2',336.0,'49135cbe551647b00c9c416c875c4a85a7b015082f70ed936a72ce8ff243037c','b2.csv','c76d646e41be2b31704d88abf8ba08eac6305db1a671741f70fa4e25d6531981','t=336','{"encoding": "utf-16", "delimiter": ";", "decimal_sign": ",", "first_data_line": 3, "ascending": true, "columns": [{"position": 0, "heading": "Frequenz/kHz", "role": "frequency", "unit": "kHz", "factor": 1000.0}, {"position": 2, "heading": "−Z″", "role": "imaginary", "unit": "MΩ", "factor": -1000000.0}], "remarks": ["Lines 1–2 were skipped."]}',NULL,NULL,NULL,'','[]','[]','','',NULL,NULL,NULL,NULL);
CREATE TABLE refused (
    refusal_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    file TEXT NOT NULL,
    reason TEXT NOT NULL
) STRICT;
INSERT INTO "refused" VALUES('1e1bb19f8c8cb65bc9214be8f5b1d0cf',0,'broken.csv','It holds no numbers.');
CREATE TABLE settings (
    campaign_id TEXT NOT NULL PRIMARY KEY
        REFERENCES campaign DEFERRABLE INITIALLY DEFERRED,
    temperature_c REAL NOT NULL,
    modulus_frequencies_hz TEXT NOT NULL, -- JSON: [0.1, 0.01]
    capacitance_frequency_hz REAL NOT NULL CHECK (capacitance_frequency_hz > 0),
    mains_hz REAL NOT NULL CHECK (mains_hz > 0),
    criteria TEXT NOT NULL DEFAULT '[]', -- JSON: [{"name", "frequency_hz", "ohm_cm2", "source"}]
    thresholds TEXT NOT NULL DEFAULT '[]' -- JSON: [[name, value]]
, input_resistance_ohm REAL CHECK (input_resistance_ohm > 0), input_capacitance_f REAL CHECK (input_capacitance_f > 0), take_leads_away INTEGER NOT NULL DEFAULT 0 CHECK (take_leads_away IN (0, 1)), own_models TEXT NOT NULL DEFAULT '[]', limits TEXT NOT NULL DEFAULT '[]', comparisons TEXT NOT NULL DEFAULT '[]', projections TEXT NOT NULL DEFAULT '[]', electrolytes TEXT NOT NULL DEFAULT '[]', regimes TEXT NOT NULL DEFAULT '[]', uptake_from_high_frequency INTEGER NOT NULL DEFAULT 0 CHECK (uptake_from_high_frequency IN (0, 1))) STRICT;
INSERT INTO "settings" VALUES('c1',23.4,'[1.0, 0.1]',9000.0,60.0,'[{"name": "house limit", "frequency_hz": 0.1, "ohm_cm2": 10000000.0, "source": "agreed with the customer"}]','[["kk_residual_percent", 1.5]]',2000000000000.0,5.0e-12,1,'[{"id": "own", "name": "Dünner Film", "layer": [{"role": "film"}]}]','[{"name": "wet", "quantity": "water_uptake", "frequency_hz": null, "side": "above", "value": 5.0, "unit": "vol-%", "source": "the maker''s sheet"}]','[{"quantity": "pore_resistance", "frequency_hz": null, "judge": "at_time", "method": "dunnett", "exposure_h": 168.0, "limit": null, "scale": "", "reference": "Grey"}, {"quantity": "modulus", "frequency_hz": 0.1, "judge": "rating", "method": "ranks", "exposure_h": null, "limit": null, "scale": "astm_d610", "reference": ""}, {"quantity": "modulus", "frequency_hz": 0.1, "judge": "time_to_limit", "method": "welch", "exposure_h": null, "limit": {"name": "low", "quantity": "modulus", "frequency_hz": 0.1, "side": "below", "value": 1000000.0, "unit": "Ω cm²", "source": "ours"}, "scale": "", "reference": ""}]','[{"quantity": "modulus", "frequency_hz": 0.1, "until_h": 2000.5}, {"quantity": "film_resistivity", "frequency_hz": null, "until_h": 1000.0}]','[{"id": "brine", "name": "Brine of the yard", "resistivity_ohm_cm": 7.5, "source": "measured", "known_by": [["brine"], ["7.5", "x"]]}]','[{"id": "ours", "name": "House cycle", "conditions": "6 h wet, 18 h dry", "electrolyte": "brine", "temperature_c": 35.0, "cycle_h": 24.0, "duration_h": [0.0, 504.0], "source": "x"}, {"id": "plain", "name": "Shelf", "conditions": "", "electrolyte": "", "temperature_c": null, "cycle_h": null, "duration_h": null, "source": ""}]',1);
CREATE TABLE spectra (
    spectrum_id TEXT NOT NULL PRIMARY KEY, -- SHA-256 of the numbers
    frequency_hz TEXT NOT NULL, -- JSON array, from the highest to the lowest
    real_ohm TEXT NOT NULL, -- JSON array, same order, per specimen
    imaginary_ohm TEXT NOT NULL -- JSON array, same order; negative for a capacitor
) STRICT;
INSERT INTO "spectra" VALUES('c78e984090c96c59de651ce68a38dce01c1034b917bd3eefd6448a52982db276','[100000.0, 1000.0, 10.0, 10.0, 0.3333333333333333, 0.1]','[4040123.326162774, 35823933242.5521, 1983.5196831098274, 34502059852.99925, 645562.1224159738, 64044.68118844323]','[-387111714.19421804, -535.5350612459978, -49466.55062419233, -0.0024312386174736166, -34198.44703894606, -35414696.26777665]');
INSERT INTO "spectra" VALUES('6d890be02099271188f84ea89d5b1244d1d6bcad1643498778f45f57f334b98a','[100000.0, 1000.0, 10.0, 10.0, 0.3333333333333333, 0.1]','[22620.865017496963, 48575.836793549206, 2128294218.8531365, 671.805382704116, 360615791.98660487, 25171247.13780125]','[-0.42718404832315304, -0.0059163353491833975, -7.072470598337806, -1599787.1654102788, -0.12614547785867272, -74425.07465000292]');
INSERT INTO "spectra" VALUES('49135cbe551647b00c9c416c875c4a85a7b015082f70ed936a72ce8ff243037c','[100000.0, 1000.0, 10.0, 10.0, 0.3333333333333333, 0.1]','[589.9870841674127, 13529.899147704231, 1627309601.4017804, 17356347.01286947, 790938.0377824432, 703.3277940457883]','[-5090.0045900252335, -0.17232361827433934, -19234465.383949023, -0.03903087422984636, -17153.887467334993, -300.0507156510653]');
INSERT INTO "spectra" VALUES('d9c9a589e503de701ea23037b4f4d4d76a0175d1d630520cc5d6bed1ae8d7fbb','[100000.0, 1000.0, 10.0, 10.0, 0.3333333333333333, 0.1]','[6795835154.791713, 38137.7336880801, 26812255.57612633, 994962577.2676554, 17314943725.789455, 278401561.25241625]','[-1110480888.1626565, -7166825110.806322, -0.0023562875173779125, -1322.7324310719926, -0.008168809404633996, -6154.893997153954]');
CREATE INDEX panels_of_formulation ON panels (formulation_id);
CREATE INDEX readings_of_panel ON readings (panel_id, exposure_h);
CREATE INDEX ratings_of_panel ON ratings (panel_id, exposure_h);
CREATE INDEX photographs_of_panel ON photographs (panel_id);
DELETE FROM "sqlite_sequence";
INSERT INTO "sqlite_sequence" VALUES('history',2);
COMMIT;

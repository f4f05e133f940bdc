CREATE TABLE rooms (
	id INTEGER PRIMARY KEY,
	name TEXT NOT NULL UNIQUE,
	illuminance_lx REAL,
	notes TEXT NOT NULL DEFAULT ''
);
CREATE TABLE stations (
	id INTEGER PRIMARY KEY,
	room_id INTEGER NOT NULL REFERENCES rooms(id),
	name TEXT NOT NULL,
	place INTEGER NOT NULL DEFAULT 0,
	UNIQUE (room_id, name)
);
CREATE TABLE monitors (
	id INTEGER PRIMARY KEY,
	station_id INTEGER REFERENCES stations(id),
	place INTEGER NOT NULL DEFAULT 0,
	serial TEXT NOT NULL UNIQUE,
	model TEXT NOT NULL DEFAULT '',
	label TEXT NOT NULL DEFAULT '',
	scheme TEXT NOT NULL DEFAULT '',
	class TEXT NOT NULL DEFAULT '',
	calibrated_in TEXT NOT NULL DEFAULT 'none',
	bits INTEGER NOT NULL DEFAULT 8,
	rd REAL,
	orientation TEXT NOT NULL DEFAULT 'landscape',
	backlight_hours REAL,
	retired INTEGER NOT NULL DEFAULT 0,
	notes TEXT NOT NULL DEFAULT ''
);
CREATE TABLE meters (
	id INTEGER PRIMARY KEY,
	name TEXT NOT NULL UNIQUE,
	kind TEXT NOT NULL DEFAULT 'contact',
	gain_uncertainty REAL NOT NULL DEFAULT 0,
	gain_k REAL NOT NULL DEFAULT 2,
	repeatability REAL,
	noise_floor_cd_m2 REAL,
	resolution_cd_m2 REAL NOT NULL DEFAULT 0,
	factor REAL NOT NULL DEFAULT 1,
	calibrated_on TEXT NOT NULL DEFAULT '',
	due_on TEXT NOT NULL DEFAULT ''
);
CREATE TABLE persons (
	id TEXT PRIMARY KEY,
	role TEXT NOT NULL DEFAULT ''
);
CREATE TABLE person_names (
	person_id TEXT PRIMARY KEY REFERENCES persons(id),
	name TEXT NOT NULL
);
CREATE TABLE drafts (
	id INTEGER PRIMARY KEY,
	monitor_id INTEGER NOT NULL REFERENCES monitors(id),
	started TEXT NOT NULL,
	head TEXT NOT NULL
);
CREATE TABLE draft_readings (
	draft_id INTEGER NOT NULL REFERENCES drafts(id) ON DELETE CASCADE,
	seq INTEGER NOT NULL,
	level INTEGER NOT NULL,
	luminance_cd_m2 REAL NOT NULL,
	role TEXT NOT NULL,
	ambient TEXT NOT NULL,
	time TEXT NOT NULL,
	PRIMARY KEY (draft_id, seq)
);
CREATE TABLE records (
	id INTEGER PRIMARY KEY,
	sha256 TEXT NOT NULL UNIQUE,
	monitor_id INTEGER REFERENCES monitors(id),
	serial TEXT NOT NULL,
	time TEXT NOT NULL,
	kind TEXT NOT NULL,
	person TEXT NOT NULL DEFAULT '',
	scheme TEXT NOT NULL DEFAULT '',
	class TEXT NOT NULL DEFAULT '',
	verdict TEXT NOT NULL,
	max_deviation REAL,
	luminance_max_cd_m2 REAL NOT NULL,
	luminance_min_cd_m2 REAL NOT NULL,
	text BLOB NOT NULL
);
CREATE INDEX records_by_time ON records (time DESC, id DESC);
CREATE INDEX records_by_monitor ON records (monitor_id, time DESC);
CREATE TABLE site (
	id INTEGER PRIMARY KEY CHECK (id = 1),
	name TEXT NOT NULL DEFAULT '',
	limits TEXT NOT NULL DEFAULT ''
);
INSERT INTO site (id) VALUES (1);

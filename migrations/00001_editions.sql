-- Models and their editions, whole: everything that a model directory says stands
-- in rows, so that SQL can ask for it, and an export gives the same bytes as the
-- directory that was imported. Limits of the domain are repeated as CHECK
-- constraints, for those who write rows by hand.
--
-- What was once active must not change, or an answer that names its edition could
-- not be had again: triggers refuse it. What is active follows from a log of
-- activations, which is only ever added to, so that going back to an earlier
-- edition is one more line in it and the log tells who did what when.
--
-- The extension is made here if it is not; that takes the rights of a superuser or
-- of the database's owner where PostGIS is trusted. It stays when all is undone.

-- +goose Up
CREATE EXTENSION IF NOT EXISTS postgis;
CREATE SCHEMA IF NOT EXISTS nearmargin;

CREATE TABLE nearmargin.models (
    model_id text PRIMARY KEY CHECK (model_id ~ '^[^@/[:space:]]+$')
);

CREATE TABLE nearmargin.editions (
    edition_id     bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY,
    model_id       text NOT NULL REFERENCES nearmargin.models,
    edition        text NOT NULL CHECK (edition ~ '^[^@/[:space:]]+$'),
    title          text NOT NULL,
    licence        text NOT NULL,
    citations      text[],           -- NULL and empty are told apart, as in model.json
    default_motion text NOT NULL,
    sha256         text NOT NULL CHECK (sha256 ~ '^[0-9a-f]{64}$'),
    warnings       text[] NOT NULL,  -- faults of the boundary network, found at import
    imported_at    timestamptz NOT NULL DEFAULT now(),
    imported_by    text NOT NULL DEFAULT session_user,
    UNIQUE (model_id, edition)
);

CREATE TABLE nearmargin.activations (
    activation_id bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY,
    edition_id    bigint NOT NULL REFERENCES nearmargin.editions,
    activated_at  timestamptz NOT NULL DEFAULT now(),
    activated_by  text NOT NULL DEFAULT session_user
);
-- The triggers below ask for it with every row that changes.
CREATE INDEX activations_edition ON nearmargin.activations (edition_id);

CREATE TABLE nearmargin.plates (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    code       text NOT NULL CHECK (code ~ '^[A-Z]{2}$'),
    name       text NOT NULL CHECK (name <> ''),
    PRIMARY KEY (edition_id, code)
);

CREATE TABLE nearmargin.boundaries (
    edition_id       bigint NOT NULL,
    boundary_id      text NOT NULL CHECK (boundary_id <> ''),
    name             text NOT NULL CHECK (name <> ''),
    type             text NOT NULL CHECK (type IN ('subduction', 'spreading_ridge', 'oceanic_transform',
                         'continental_transform', 'continental_rift', 'continental_convergence', 'oceanic_convergence')),
    left_plate       text NOT NULL,
    right_plate      text NOT NULL,
    subducting_plate text,
    sigma_km         double precision NOT NULL CHECK (sigma_km > 0 AND sigma_km < 'Infinity'),
    source           text NOT NULL CHECK (source <> ''),
    source_status    text NOT NULL CHECK (source_status IN ('memory', 'consulted')),
    -- from first to last vertex left_plate is on the left; may cross ±180°
    path             geography(LineString, 4326) NOT NULL,
    PRIMARY KEY (edition_id, boundary_id),
    FOREIGN KEY (edition_id, left_plate) REFERENCES nearmargin.plates ON DELETE CASCADE,
    FOREIGN KEY (edition_id, right_plate) REFERENCES nearmargin.plates ON DELETE CASCADE,
    CHECK (left_plate <> right_plate),
    CHECK (subducting_plate IN (left_plate, right_plate)),
    CHECK (type <> 'subduction' OR subducting_plate IS NOT NULL)
);
-- For the nearest boundary (<->) and for what lies within a distance (ST_DWithin).
CREATE INDEX boundaries_path ON nearmargin.boundaries USING gist (path);

CREATE TABLE nearmargin.junctions (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    ordinal    int NOT NULL,
    name       text NOT NULL CHECK (name <> ''),
    at         geography(Point, 4326) NOT NULL,
    PRIMARY KEY (edition_id, ordinal)
);

CREATE TABLE nearmargin.motion_models (
    edition_id  bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    name        text NOT NULL CHECK (name ~ '^[a-z0-9]+(-[a-z0-9]+)*$'),
    ordinal     int NOT NULL,
    title       text NOT NULL,
    frame       text NOT NULL,
    time_span   text NOT NULL,
    citation    text NOT NULL,
    relative_to text NOT NULL,    -- code of a fixed plate, or empty
    columns     text[] NOT NULL,  -- of the table as it was published
    PRIMARY KEY (edition_id, name),
    UNIQUE (edition_id, ordinal)
);
-- An edition's default is one of its own motion models; checked when it is whole.
ALTER TABLE nearmargin.editions ADD FOREIGN KEY (edition_id, default_motion)
    REFERENCES nearmargin.motion_models DEFERRABLE INITIALLY DEFERRED;

CREATE TABLE nearmargin.angular_velocities (
    edition_id bigint NOT NULL,
    motion     text NOT NULL,
    ordinal    int NOT NULL,
    plate      text NOT NULL,
    basis      text NOT NULL CHECK (basis ~ '^(published|composed:[A-Z]{2})$'),
    -- towards 0°N 0°E, 0°N 90°E and the north pole
    wx_rad_myr double precision NOT NULL CHECK (abs(wx_rad_myr) < 5),
    wy_rad_myr double precision NOT NULL CHECK (abs(wy_rad_myr) < 5),
    wz_rad_myr double precision NOT NULL CHECK (abs(wz_rad_myr) < 5),
    cells      text[] NOT NULL,  -- the row as it was published, digit for digit
    PRIMARY KEY (edition_id, motion, plate),
    UNIQUE (edition_id, motion, ordinal),
    FOREIGN KEY (edition_id, motion) REFERENCES nearmargin.motion_models ON DELETE CASCADE,
    FOREIGN KEY (edition_id, plate) REFERENCES nearmargin.plates ON DELETE CASCADE
);

CREATE TABLE nearmargin.zones (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    ordinal    int NOT NULL,
    name       text NOT NULL CHECK (name <> ''),
    kind       text NOT NULL CHECK (kind IN ('collision', 'extension', 'shear', 'mixed')),
    source     text NOT NULL CHECK (source <> ''),
    area       geography(Polygon, 4326) NOT NULL,
    PRIMARY KEY (edition_id, ordinal)
);

CREATE TABLE nearmargin.hotspots (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    ordinal    int NOT NULL,
    name       text NOT NULL CHECK (name <> ''),
    source     text NOT NULL CHECK (source <> ''),
    at         geography(Point, 4326) NOT NULL,
    PRIMARY KEY (edition_id, ordinal)
);

CREATE TABLE nearmargin.land (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    ordinal    int NOT NULL,
    name       text NOT NULL CHECK (name <> ''),
    outline    geography(Polygon, 4326) NOT NULL,
    PRIMARY KEY (edition_id, ordinal)
);

-- Faults of the data that are known and kept with the edition; lon and lat are
-- NULL for one that has no place.
CREATE TABLE nearmargin.warnings (
    edition_id bigint NOT NULL REFERENCES nearmargin.editions ON DELETE CASCADE,
    ordinal    int NOT NULL,
    code       text NOT NULL CHECK (code ~ '^[a-z]+(_[a-z]+)*$'),
    lon        double precision CHECK (lon BETWEEN -180 AND 180),
    lat        double precision CHECK (lat BETWEEN -90 AND 90),
    detail     text NOT NULL CHECK (detail <> ''),
    CHECK ((lon IS NULL) = (lat IS NULL)),
    PRIMARY KEY (edition_id, ordinal)
);

CREATE TABLE nearmargin.slabs (
    edition_id       bigint NOT NULL,
    slab_id          text NOT NULL CHECK (slab_id ~ '^[a-z0-9]+(-[a-z0-9]+)*$'),
    name             text NOT NULL CHECK (name <> ''),
    kind             text NOT NULL CHECK (kind IN ('subduction', 'collision')),
    subducting_plate text NOT NULL,
    overriding_plate text NOT NULL,
    arc_min_depth_km double precision NOT NULL CHECK (arc_min_depth_km BETWEEN 60 AND 100),
    source           text NOT NULL CHECK (source <> ''),
    source_status    text NOT NULL CHECK (source_status IN ('memory', 'consulted')),
    PRIMARY KEY (edition_id, slab_id),
    FOREIGN KEY (edition_id, subducting_plate) REFERENCES nearmargin.plates ON DELETE CASCADE,
    FOREIGN KEY (edition_id, overriding_plate) REFERENCES nearmargin.plates ON DELETE CASCADE
);

CREATE TABLE nearmargin.slab_boundaries (
    edition_id  bigint NOT NULL,
    slab_id     text NOT NULL,
    ordinal     int NOT NULL,
    boundary_id text NOT NULL,
    PRIMARY KEY (edition_id, slab_id, ordinal),
    FOREIGN KEY (edition_id, slab_id) REFERENCES nearmargin.slabs ON DELETE CASCADE,
    FOREIGN KEY (edition_id, boundary_id) REFERENCES nearmargin.boundaries ON DELETE CASCADE
);

CREATE TABLE nearmargin.slab_contours (
    edition_id bigint NOT NULL,
    slab_id    text NOT NULL,
    ordinal    int NOT NULL,
    depth_km   double precision NOT NULL CHECK (depth_km BETWEEN 0 AND 800),
    sigma_km   double precision NOT NULL CHECK (sigma_km > 0 AND sigma_km < 'Infinity'),
    path       geography(LineString, 4326) NOT NULL,  -- the slab deepens to its right
    PRIMARY KEY (edition_id, slab_id, ordinal),
    FOREIGN KEY (edition_id, slab_id) REFERENCES nearmargin.slabs ON DELETE CASCADE
);

CREATE TABLE nearmargin.slab_grids (
    edition_id bigint NOT NULL,
    slab_id    text NOT NULL,
    layer      text NOT NULL CHECK (layer IN ('depth', 'sigma', 'dip', 'strike', 'thickness')),
    gzipped    boolean NOT NULL,
    content    bytea NOT NULL,  -- lon,lat,value lines, as the file holds them
    PRIMARY KEY (edition_id, slab_id, layer),
    FOREIGN KEY (edition_id, slab_id) REFERENCES nearmargin.slabs ON DELETE CASCADE
);
-- Grids are compressed or made of digits that the server would try to compress again.
ALTER TABLE nearmargin.slab_grids ALTER COLUMN content SET STORAGE EXTERNAL;

-- +goose StatementBegin
CREATE FUNCTION nearmargin.refuse_change() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
    IF TG_OP = 'TRUNCATE' THEN
        IF EXISTS (SELECT FROM nearmargin.activations) THEN
            RAISE EXCEPTION 'an edition that was once active never changes'
                USING ERRCODE = 'NM001', TABLE = TG_TABLE_NAME, HINT = 'Import a new edition.';
        END IF;
        RETURN NULL;
    END IF;
    IF EXISTS (SELECT FROM nearmargin.activations a WHERE a.edition_id IN (OLD.edition_id, NEW.edition_id)) THEN
        RAISE EXCEPTION 'an edition that was once active never changes'
            USING ERRCODE = 'NM001', TABLE = TG_TABLE_NAME, HINT = 'Import a new edition.';
    END IF;
    RETURN coalesce(NEW, OLD);
END $$;
-- +goose StatementEnd

-- +goose StatementBegin
CREATE FUNCTION nearmargin.refuse_rewriting() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
    RAISE EXCEPTION 'the log of activations is only ever added to'
        USING ERRCODE = 'NM001', TABLE = TG_TABLE_NAME, HINT = 'Activate the edition that is wanted.';
END $$;
-- +goose StatementEnd

-- +goose StatementBegin
CREATE FUNCTION nearmargin.tell_activation() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
    PERFORM pg_notify('nearmargin_activation', NEW.edition_id::text);
    RETURN NULL;
END $$;
-- +goose StatementEnd

-- +goose StatementBegin
DO $$
DECLARE
    name text;
BEGIN
    FOREACH name IN ARRAY ARRAY['editions', 'plates', 'boundaries', 'junctions', 'motion_models', 'angular_velocities',
        'zones', 'hotspots', 'land', 'warnings', 'slabs', 'slab_boundaries', 'slab_contours', 'slab_grids'] LOOP
        EXECUTE format('CREATE TRIGGER never_change BEFORE INSERT OR UPDATE OR DELETE ON nearmargin.%I
            FOR EACH ROW EXECUTE FUNCTION nearmargin.refuse_change()', name);
        EXECUTE format('CREATE TRIGGER never_empty BEFORE TRUNCATE ON nearmargin.%I
            FOR EACH STATEMENT EXECUTE FUNCTION nearmargin.refuse_change()', name);
    END LOOP;
END $$;
-- +goose StatementEnd

CREATE TRIGGER never_rewrite BEFORE UPDATE OR DELETE OR TRUNCATE ON nearmargin.activations
    FOR EACH STATEMENT EXECUTE FUNCTION nearmargin.refuse_rewriting();
CREATE TRIGGER tell AFTER INSERT ON nearmargin.activations
    FOR EACH ROW EXECUTE FUNCTION nearmargin.tell_activation();

-- +goose Down
ALTER TABLE nearmargin.editions DROP CONSTRAINT editions_edition_id_default_motion_fkey;
DROP TABLE nearmargin.slab_grids, nearmargin.slab_contours, nearmargin.slab_boundaries, nearmargin.slabs,
    nearmargin.warnings, nearmargin.land, nearmargin.hotspots, nearmargin.zones, nearmargin.angular_velocities, nearmargin.motion_models,
    nearmargin.junctions, nearmargin.boundaries, nearmargin.plates, nearmargin.activations, nearmargin.editions,
    nearmargin.models;
DROP FUNCTION nearmargin.refuse_change();
DROP FUNCTION nearmargin.refuse_rewriting();
DROP FUNCTION nearmargin.tell_activation();

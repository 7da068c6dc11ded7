-- The nearest boundary in plain SQL, for those who cannot run a program:
--
--     SELECT w.id, n.* FROM wells w, nearmargin.nearest(w.geom::geography) n;
--
-- It answers from the active edition and its default motion model, and as the service
-- does: the nearest arc on the sphere tells on which plate the site lies; of the arcs
-- that bound this plate and lie within 1 % of that distance the one is taken to whose
-- nearest point the WGS84 geodesic is shortest; of those equally far (1 µm) the one
-- that the line of sight meets more squarely, then the lower id. PostGIS finds the
-- boundaries that come into question; the arcs themselves are measured here, because
-- PostGIS does not tell the nearest point, nor the side on which the site lies.
--
-- The caller needs what the service needs: USAGE on the schema, SELECT on its tables.

-- +goose Up
-- +goose StatementBegin
CREATE FUNCTION nearmargin.nearest(site geography)
RETURNS TABLE (
    boundary_id text, name text, type text,
    plate text,                     -- on which the site lies
    left_plate text, right_plate text, subducting_plate text,
    distance_km double precision,   -- along the WGS84 geodesic
    azimuth_deg double precision,   -- of that geodesic at the site, [0, 360); NULL at distance 0
    nearest_point geography,
    motion_plate text, relative_to text, -- the plate across, as seen from the site's
    rate_mm_yr double precision, rate_azimuth_deg double precision,
    opening_mm_yr double precision, -- positive where the plates part
    shear_mm_yr double precision,   -- positive right-lateral
    obliquity_deg double precision, -- 0 square to the boundary, 90 along it
    motion_model text,              -- NULL, with the motion, where it lacks a plate
    model text                      -- id@edition
)
LANGUAGE sql STABLE PARALLEL SAFE ROWS 1 COST 10000 AS $$
WITH active AS MATERIALIZED (
    SELECT e.edition_id, e.model_id || '@' || e.edition AS ref, e.default_motion
    FROM nearmargin.activations a JOIN nearmargin.editions e USING (edition_id)
    ORDER BY a.activation_id DESC LIMIT 1
), here AS MATERIALIZED (           -- the site as a unit vector p
    SELECT cos(r.lat) * cos(r.lon) AS px, cos(r.lat) * sin(r.lon) AS py, sin(r.lat) AS pz
    FROM (SELECT radians(ST_X(site::geometry)) AS lon, radians(ST_Y(site::geometry)) AS lat OFFSET 0) r
    WHERE NOT ST_IsEmpty(site::geometry)
), closest AS MATERIALIZED (        -- <-> measures on the sphere, by the index
    SELECT b.edition_id, b.path <-> site AS metres
    FROM nearmargin.boundaries b
    WHERE b.edition_id = (SELECT edition_id FROM active) AND EXISTS (SELECT FROM here)
    ORDER BY b.path <-> site LIMIT 1
), candidate AS MATERIALIZED (      -- all within 1 %, and a metre for rounding
    SELECT b.* FROM closest c JOIN nearmargin.boundaries b USING (edition_id)
    WHERE ST_DWithin(b.path, site, c.metres * 1.01 + 1, false)
), vertex AS MATERIALIZED (
    SELECT c.boundary_id AS id, d.path[1] AS n,
           cos(r.lat) * cos(r.lon) AS x, cos(r.lat) * sin(r.lon) AS y, sin(r.lat) AS z
    FROM candidate c, LATERAL ST_DumpPoints(c.path::geometry) d,
         LATERAL (SELECT radians(ST_X(d.geom)) AS lon, radians(ST_Y(d.geom)) AS lat OFFSET 0) r
), pair AS (                        -- arcs from a to b
    SELECT id, n, x AS ax, y AS ay, z AS az, lead(x) OVER w AS bx, lead(y) OVER w AS by, lead(z) OVER w AS bz
    FROM vertex WINDOW w AS (PARTITION BY id ORDER BY n)
), crossed AS MATERIALIZED (        -- (a-b)×(a+b) keeps its digits where a and b are close
    SELECT *, (ay-by)*(az+bz) - (az-bz)*(ay+by) AS cx,
              (az-bz)*(ax+bx) - (ax-bx)*(az+bz) AS cy,
              (ax-bx)*(ay+by) - (ay-by)*(ax+bx) AS cz
    FROM pair WHERE bx IS NOT NULL
), arc AS MATERIALIZED (            -- the unit normal, to the left of the path
    SELECT c.id, c.n, ax, ay, az, bx, by, bz, cx / l AS nx, cy / l AS ny, cz / l AS nz
    FROM crossed c, LATERAL (SELECT sqrt(cx*cx + cy*cy + cz*cz) AS l OFFSET 0) s WHERE l > 0
), seen AS MATERIALIZED (           -- h: height of p above the arc's plane; how far p lies beyond either end
    SELECT a.*, px, py, pz, px*nx + py*ny + pz*nz AS h,
           px*(ny*az - nz*ay) + py*(nz*ax - nx*az) + pz*(nx*ay - ny*ax) AS from_a,
           px*(by*nz - bz*ny) + py*(bz*nx - bx*nz) + pz*(bx*ny - by*nx) AS from_b,
           (ax-px)*(ax-px) + (ay-py)*(ay-py) + (az-pz)*(az-pz) AS to_a,
           (bx-px)*(bx-px) + (by-py)*(by-py) + (bz-pz)*(bz-pz) AS to_b
    FROM arc a, here
), measured AS MATERIALIZED (
    SELECT s.*, from_a > 1e-15 AND from_b > 1e-15 AS inside,
           CASE WHEN from_a > 1e-15 AND from_b > 1e-15 THEN 2*h*h / (1 + sqrt(greatest(0, 1 - h*h))) ELSE least(to_a, to_b) END AS chord_sq
    FROM seen s
), under AS MATERIALIZED (          -- at a vertex the arc that turns most towards p tells the side
    SELECT CASE WHEN m.h >= 0 THEN c.left_plate ELSE c.right_plate END AS plate,
           2 * asin(least(1, sqrt(m.chord_sq) / 2)) AS angle
    FROM measured m JOIN candidate c ON c.boundary_id = m.id
    ORDER BY m.chord_sq, CASE WHEN m.inside THEN 2 WHEN m.to_a <= m.to_b THEN m.from_a ELSE m.from_b END DESC, m.id, m.n LIMIT 1
), rival AS MATERIALIZED (          -- q: the arc's nearest point, not yet a unit vector
    SELECT m.*, u.plate,
           CASE WHEN inside THEN px - nx*h WHEN to_a <= to_b THEN ax ELSE bx END AS qx,
           CASE WHEN inside THEN py - ny*h WHEN to_a <= to_b THEN ay ELSE by END AS qy,
           CASE WHEN inside THEN pz - nz*h WHEN to_a <= to_b THEN az ELSE bz END AS qz
    FROM measured m JOIN candidate c ON c.boundary_id = m.id, under u
    WHERE u.plate IN (c.left_plate, c.right_plate)
      AND 2 * asin(least(1, sqrt(m.chord_sq) / 2)) <= u.angle * 1.01 + 1e-12
), foot AS MATERIALIZED (
    SELECT r.id, r.n, r.plate, nx, ny, nz, px, py, pz, qx / l AS qx, qy / l AS qy, qz / l AS qz,
           ST_SetSRID(ST_MakePoint(degrees(atan2(qy, qx)), degrees(atan2(qz, sqrt(qx*qx + qy*qy)))), 4326)::geography AS at
    FROM rival r, LATERAL (SELECT sqrt(qx*qx + qy*qy + qz*qz) AS l OFFSET 0) s
), apart AS MATERIALIZED (
    SELECT f.*, ST_Distance(site, at, true) / 1000 AS km,
           abs(px*nx + py*ny + pz*nz) / nullif(sqrt((px-qx*c)*(px-qx*c) + (py-qy*c)*(py-qy*c) + (pz-qz*c)*(pz-qz*c)), 0) AS square
    FROM foot f, LATERAL (SELECT px*qx + py*qy + pz*qz AS c OFFSET 0) s
), best AS MATERIALIZED (
    SELECT * FROM (SELECT *, min(km) OVER () AS least_km FROM apart) a
    WHERE km <= least_km + 1e-9
    ORDER BY round((coalesce(square, 0) * 1e8)::numeric) DESC, id COLLATE "C", n LIMIT 1
), answer AS MATERIALIZED (
    SELECT b.*, c.name, c.type, c.left_plate, c.right_plate, c.subducting_plate, a.ref, a.default_motion,
           CASE WHEN c.left_plate = b.plate THEN c.right_plate ELSE c.left_plate END AS across,
           CASE WHEN c.left_plate = b.plate THEN 1 ELSE -1 END AS hand,
           there.wx_rad_myr - seat.wx_rad_myr AS wx, there.wy_rad_myr - seat.wy_rad_myr AS wy, there.wz_rad_myr - seat.wz_rad_myr AS wz
    FROM best b JOIN candidate c ON c.boundary_id = b.id CROSS JOIN active a
    LEFT JOIN nearmargin.angular_velocities seat
        ON seat.edition_id = a.edition_id AND seat.motion = a.default_motion AND seat.plate = b.plate
    LEFT JOIN nearmargin.angular_velocities there
        ON there.edition_id = a.edition_id AND there.motion = a.default_motion
        AND there.plate = CASE WHEN c.left_plate = b.plate THEN c.right_plate ELSE c.left_plate END
), moving AS MATERIALIZED (         -- v = ω × q on the sphere of the mean radius, km/Myr; the path's direction t = n × q
    SELECT a.*, 6371.0088 * (wy*qz - wz*qy) AS vx, 6371.0088 * (wz*qx - wx*qz) AS vy, 6371.0088 * (wx*qy - wy*qx) AS vz,
           ny*qz - nz*qy AS tx, nz*qx - nx*qz AS ty, nx*qy - ny*qx AS tz
    FROM answer a
), motion AS MATERIALIZED (         -- out of the left plate is -n, for those on it
    SELECT m.*, sqrt(vx*vx + vy*vy + vz*vz) AS rate, -hand * (vx*nx + vy*ny + vz*nz) AS opening, -hand * (vx*tx + vy*ty + vz*tz) AS shear,
           degrees(atan2(vy*qx - vx*qy, vz * (qx*qx + qy*qy) - qz * (vx*qx + vy*qy))) AS heading
    FROM moving m
)
SELECT id, name, type, plate, left_plate, right_plate, subducting_plate, km,
       CASE WHEN km >= 1e-6 THEN degrees(ST_Azimuth(site, at)) END,
       at, across, plate, rate,
       CASE WHEN rate >= 1e-9 THEN CASE WHEN heading < 0 THEN heading + 360 ELSE heading END END,
       opening, shear,
       CASE WHEN rate >= 1e-9 THEN degrees(atan2(abs(shear), abs(opening))) END,
       CASE WHEN rate IS NOT NULL THEN default_motion END, ref
FROM motion
$$;
-- +goose StatementEnd

COMMENT ON FUNCTION nearmargin.nearest(geography) IS
    'The boundary of the active edition that is nearest to a point, its distance on WGS84, and the motion across it; no row for NULL and for an empty point';

-- +goose Down
DROP FUNCTION nearmargin.nearest(geography);

-- Schema 3. A reading may have been computed from captured samples; a waveform's step is kept with it.

ALTER TABLE reading ADD COLUMN from_waveform INTEGER CHECK (from_waveform = 1); -- NULL: an instrument's own, or typed
ALTER TABLE waveform ADD COLUMN step_v REAL CHECK (step_v > 0 AND step_v < 9e999); -- the converter's step; NULL: not known

DROP VIEW trial_table;
CREATE VIEW trial_table AS
SELECT
  t.id AS id, b.name AS board, v.name AS revision,
  t.network AS network, t.c AS c, t.c_tol AS c_tol, t.r AS r, t.r_tol AS r_tol, t.probe_c AS probe_c,
  coalesce(p.bus_v, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'bus_v')) AS bus_v,
  coalesce(p.current_a, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'current_a')) AS current_a,
  coalesce(p.switching_hz, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'switching_hz')) AS switching_hz,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'ring_hz') AS ring_hz,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'ring_hz') AS ring_hz_u,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'decay_s') AS decay_s,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'decay_s') AS decay_s_u,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'peak_v') AS peak_v,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'peak_v') AS peak_v_u,
  t.at AS at, t.part AS part, t.note AS note,
  (SELECT because FROM strike WHERE trial = t.seq ORDER BY at, id LIMIT 1) AS struck,
  (SELECT count(*) FROM waveform WHERE trial = t.seq) AS waveforms,
  (SELECT group_concat(quantity, ' ')
    FROM (SELECT quantity FROM reading WHERE trial = t.seq AND from_waveform = 1 ORDER BY quantity)) AS from_waveform
FROM trial t
JOIN revision v ON v.id = t.revision
JOIN board b ON b.id = v.board
LEFT JOIN operating_point p ON p.id = t.operating_point;

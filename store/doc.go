// Package store is the logbook: boards and their revisions, and every trial made on them, in one SQLite file.
//
// A logbook is written once. A trial, its readings, its waveforms and its strikes, a decision, and what is stated of a board are rows
// that are added and never changed, replaced or deleted; triggers in the file itself refuse that to any program that does
// not first drop them. Each is sealed into a chain, so that an audit finds what was changed all the same. A
// trial found to be wrong is struck: a row with the reason, beside the trial, which stays readable. What Add has
// acknowledged is on the disk: the file is kept in write-ahead-log mode with synchronous FULL, and a process killed at any
// moment leaves it sound.
//
// It is not a database layer for other programs: it knows this one schema, and it refuses a file that is not its own
// without touching it.
//
// Open makes or opens a logbook; Add logs one trial, AddWithWaveforms one with the captures behind its readings, AddAll many
// or none; Trials streams those in a Scope, Trial finds one by its id or the end of it, Waveforms gives its captures, Strike
// marks one as wrong. AddDecision logs what was recommended with the trials it rests on
// and their TrialsDigest, Decisions and Decision give it back, DecisionTrials its trials. A Monitor tells whether anything was
// written since it was last asked. Search and Count answer a Query of words, ranges and dates. Audit looks at everything; Merge
// adds another bench's logbook, Backup copies one in use; ExportJSON and ImportJSON carry all of one as JSON Lines, ReadCSV and
// WriteCSV trials as CSV. What a person
// has to know of a file that cannot be used is a Fault: the path, what is wrong, and the cure.
//
// # The file
//
// SQLite 3 (https://sqlite.org/fileformat2.html), application_id 0x726E6762 ("rngb"), user_version the number of the
// last migration. Schema changes are migrations in migrations/, numbered, added at the end and never edited once
// released; each runs in one transaction with its user_version.
//
// # The view trial_table
//
// Any SQL tool can read the history from one view, a row for each trial. Its columns are those of the CSV, with the same
// names and units, between the trial's id and its strike:
//
//	id            the trial's identity, a UUID version 7 (RFC 9562) in text
//	board         the board's name
//	revision      the board revision's name
//	network       what was fitted across the switch: bare, c, rc, rcd
//	c             its capacitor, F
//	c_tol         bound of the capacitor's error as a fraction of c
//	r             its resistor, ohm
//	r_tol         bound of the resistor's error as a fraction of r
//	probe_c       the probe's capacitance across the node while reading, F
//	bus_v         bus voltage, V: as set for the operating point, else as read
//	current_a     load current, A: the same
//	switching_hz  switching frequency, Hz: the same
//	ring_hz       the ring's damped frequency as seen, Hz
//	ring_hz_u     its standard uncertainty (k = 1), Hz
//	decay_s       1/e time of the ring's envelope, s
//	decay_s_u     its standard uncertainty, s
//	peak_v        highest voltage across the switch, V
//	peak_v_u      its standard uncertainty, V
//	at            when it was read, RFC 3339 in UTC with nine decimals, so that text order is time order
//	part          what was fitted, in words
//	note          whatever was noted
//	struck        why the trial was marked as wrong; NULL while it stands
//	waveforms     how many captures are kept with it (since schema 3, as the next)
//	from_waveform which of its readings were computed from samples: their names, with spaces between; NULL for none
//
// NULL is "not read" or "not stated". A trial logged without a time has that of its logging: its at is then the logged_at of
// table trial. For example, the fastest bare ring of each revision:
//
//	SELECT board, revision, max(ring_hz) FROM trial_table WHERE struck IS NULL AND network = 'bare' GROUP BY 1, 2;
//
// # Waveforms
//
// A captured edge is kept in table waveform with its trial: the samples in volts, bit for bit, packed by waveform.Pack in the
// encoding it names, and the SHA-256 (FIPS 180-4) of the packed bytes, which is looked at whenever they are read. A new
// encoding comes with a new schema, so that no older program takes it for damage. A reading that was computed from samples
// rather than by the instrument says so (from_waveform; the digests of trials without one are what they were).
//
// A better estimator reads the same samples again, and what it finds is shown beside what was logged. It is not stored:
// there is nothing that could go stale, and what a decision rested on stays. Where it is to count from now on, log
// a new trial with the same waveforms, and strike the old one with the reason.
//
// # The chain
//
// Since schema 4, each trial (with its readings and waveforms), strike, decision and correction is an entry of table chain, in
// the order of logging: the table it is in (kind), its row there, and its link, the SHA-256 of the entry's text and the link
// before. The text is that of TrialsDigest for a trial, then "logged_at TIME", and for each waveform the lines waveform (its id),
// start_s, interval_s, step_v, encoding, sha256 and origin; for the others it has the same style, with the names of the
// columns. What is hashed before and after it stands at place.seal in chain.go, and testdata/chain.py does it once more in
// Python. A link depends on no row number, so that it can be computed in any file.
//
// Every logbook has an id (table logbook, row 1). An entry that was merged or imported is an entry of this chain too, and table
// origin keeps the logbook and the place in its chain where it was first logged, with the link there and the one before: it
// can be proved against either chain. Of a logbook that was copied and went on in both copies the chains part, and
// their entries merge like any others.
//
// A chain shows what was changed in it or taken out of it; it does not show that its end was cut off, or that all of it was made
// anew. The last link (Report.Head), noted elsewhere, shows that as well.
//
// What is stated of a board or revision, a rating or a note, is a row of table correction, each time; tables board and
// revision have what was stated last.
//
// # Words
//
// Since schema 4, names are indexed by FTS5 in name_word as they come, and the parts and notes of trials in trial_word, a stretch
// of some hundred trials at a time; a search looks at the trials since the last stretch as they are. Table stretch has
// the bounds of each in time, by which a search finds where to begin and where to stop. The index follows from the trials, and is
// no part of the chain.
//
// # The view decision_table
//
// Since schema 2, a row for each decision: what was recommended, what was predicted of it, and for what.
//
//	id              the decision's identity, a UUID version 7 in text
//	board           the board's name
//	revision        the board revision's name
//	network         what was recommended: c, rc, rcd
//	c               its capacitor, F
//	c_tol           bound of the capacitor's error as a fraction of c
//	r               its resistor, ohm
//	r_tol           bound of the resistor's error as a fraction of r
//	limit_v         the peak it is to stay under, V
//	peak_v          the peak predicted, V
//	peak_v_u        its standard uncertainty (k = 1), V
//	peak_v_low      lower end of its 95 % interval, V
//	peak_v_high     upper end of it, V
//	damping_ratio   damping ratio of the least damped pair
//	loss_w          what the ring and the network lose, W
//	bus_v           the operating point it was made for: bus voltage, V
//	excitation_a    and loop current at the instant the switch lets go, A
//	switching_hz    and switching frequency, Hz
//	inductance_h    the loop it was made for: inductance, H
//	capacitance_f   capacitance, F
//	resistance_ohm  loss resistance, ohm; NULL where no decay was read
//	at              when it was made, as in trial_table
//	trials          how many trials it rests on
//	struck          how many of these have been struck since
//	digest          SHA-256 of these trials as they were; TrialsDigest says of what text
//
// Table decision_trial names the trials, and decision.recommendation keeps the whole answer as JSON. What was then measured
// with the network recommended, for example:
//
//	SELECT d.id, d.peak_v, t.peak_v FROM decision_table d JOIN trial_table t USING (board, revision, network)
//	WHERE t.at >= d.at AND t.c = d.c AND t.r IS d.r AND t.struck IS NULL;
package store

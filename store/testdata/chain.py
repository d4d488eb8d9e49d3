"""Recomputes the chain of the logbook named on the command line, from its tables and by the rules that the package states, with
Python's own SQLite, SHA-256 and decimals. Prints the logbook's id, the last link and how many entries agree."""
import decimal, hashlib, sqlite3, sys

db = sqlite3.connect("file:" + sys.argv[1] + "?mode=ro", uri=True)
db.row_factory = sqlite3.Row


def one(query, *args):
    return db.execute(query, args).fetchone()


def number(v):
    """The shortest digits that read back as v; with an exponent below 1e-4 and from 1e6."""
    sign, digits, exponent = decimal.Decimal(repr(float(v))).as_tuple()
    digits = "".join(map(str, digits)).lstrip("0")
    if digits == "":
        return "0"
    exponent += len(digits) - len(digits.rstrip("0"))
    digits = digits.rstrip("0")
    e = exponent + len(digits) - 1
    minus = "-" if sign else ""
    if e < -4 or e >= 6:
        return minus + digits[0] + ("." + digits[1:] if digits[1:] else "") + "e%+03d" % e
    if e < 0:
        return minus + "0." + "0" * (-e - 1) + digits
    whole = digits[: e + 1].ljust(e + 1, "0")
    return minus + whole + ("." + digits[e + 1 :] if digits[e + 1 :] else "")


def lines(row, *names):
    out = ""
    for name in names:
        name, column = name if isinstance(name, tuple) else (name, name)
        v = row[column]
        if v is None or v == "" or v == 0:
            continue
        v = number(v) if isinstance(v, float) else v.replace("\\", "\\\\").replace("\n", "\\n")
        out += name + " " + v + "\n"
    return out


def trial(n):
    t = one("""SELECT t.*, b.name AS board_name, v.name AS revision_name, s.name AS session_name, p.bus_v, p.current_a, p.switching_hz
      FROM trial t JOIN revision v ON v.id = t.revision JOIN board b ON b.id = v.board
      LEFT JOIN session s ON s.id = t.session LEFT JOIN operating_point p ON p.id = t.operating_point WHERE t.seq = ?""", n)
    out = lines(t, ("trial", "id"), ("board", "board_name"), ("revision", "revision_name"), ("session", "session_name"), "at", "network",
                "c", "c_tol", "r", "r_tol", "esr", "measured_c", "measured_c_u", "probe_c", "bus_v", "current_a", "switching_hz", "part", "note")
    for r in db.execute("SELECT r.*, i.idn FROM reading r LEFT JOIN instrument i ON i.id = r.instrument WHERE trial = ? ORDER BY quantity", (n,)):
        out += "reading " + r["quantity"] + " " + number(r["value"]) + "\n" + lines(r, "u", ("instrument", "idn"))
        out += "from waveform\n" if r["from_waveform"] else ""
        for q in db.execute("SELECT value FROM reading_repeat WHERE trial = ? AND quantity = ? ORDER BY n", (n, r["quantity"])):
            out += "repeat " + number(q[0]) + "\n"
    out += lines(t, "logged_at")
    for w in db.execute("SELECT * FROM waveform WHERE trial = ? ORDER BY seq", (n,)):
        out += lines(w, ("waveform", "id")) + "start_s " + number(w["start_s"]) + "\n" + lines(w, "interval_s", "step_v", "encoding")
        out += "sha256 " + hashlib.sha256(w["samples"]).hexdigest() + "\n" + lines(w, "origin")
    return out


def strike(n):
    return lines(one("SELECT k.*, t.id AS trial_id FROM strike k JOIN trial t ON t.seq = k.trial WHERE k.seq = ?", n),
                 ("strike", "id"), ("trial", "trial_id"), "at", "because")


def decision(n):
    d = one("""SELECT d.*, b.name AS board_name, v.name AS revision_name FROM decision d
      JOIN revision v ON v.id = d.revision JOIN board b ON b.id = v.board WHERE d.seq = ?""", n)
    out = lines(d, ("decision", "id"), ("board", "board_name"), ("revision", "revision_name"), "at", "network", "c", "c_tol", "r", "r_tol", "limit_v",
                "peak_v", "peak_v_u", "peak_v_low", "peak_v_high", "damping_ratio", "loss_w", "bus_v", "excitation_a", "switching_hz",
                "inductance_h", "capacitance_f", "resistance_ohm", "digest")
    for t in db.execute("SELECT t.id FROM decision_trial x JOIN trial t ON t.seq = x.trial WHERE x.decision = ? ORDER BY t.id", (n,)):
        out += "rests_on " + t[0] + "\n"
    return out + lines(d, "recommendation")


def correction(n):
    return lines(one("""SELECT c.*, b.name AS board_name, v.name AS revision_name FROM correction c
      JOIN board b ON b.id = c.board LEFT JOIN revision v ON v.id = c.revision WHERE c.seq = ?""", n),
                 ("correction", "id"), ("board", "board_name"), ("revision", "revision_name"), "at", "device_v", "note")


def sha256(text):
    return hashlib.sha256(text.encode()).hexdigest()


logbook = one("SELECT id FROM logbook WHERE n = 1")[0]
previous = sha256("ringbook chain 1\nlogbook %s\n" % logbook)
agree = 0
for c in db.execute("""SELECT c.*, l.id AS logbook, o.seq AS there, o.link AS link_there FROM chain c
  LEFT JOIN origin o ON o.chain = c.seq LEFT JOIN logbook l ON l.n = o.logbook ORDER BY c.seq""").fetchall():
    text = {"trial": trial, "strike": strike, "decision": decision, "correction": correction}[c["kind"]](c["row"])
    if c["logbook"]:
        text += "origin %s %d %s\n" % (c["logbook"], c["there"], c["link_there"].hex())
    link = sha256("ringbook chain 1\nlogbook %s\nentry %d\nprevious %s\n" % (logbook, c["seq"], previous) + text)
    agree += link == c["link"].hex()
    previous = link
print(logbook, previous, agree)

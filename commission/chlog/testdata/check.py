# Reads and checks a log from FORMAT.md alone: python3 check.py NAME.chlog allowed_signers. Ends with 1 and a reason if it does not hold.
import hashlib, json, re, subprocess, sys, tempfile
def wanted(ok, why):
    if not ok: sys.exit(f"{sys.argv[1]}: {why}")
def pairs(items):
    wanted(len({k.casefold() for k, _ in items}) == len(items), "a key stands twice, if only in another case")
    return dict(items)
def signed(message, armour, principal=None):
    with tempfile.NamedTemporaryFile("w") as sig:
        sig.write(armour), sig.flush()
        how = ["verify", "-f", sys.argv[2], "-I", principal] if principal else ["check-novalidate"]
        return subprocess.run(["ssh-keygen", "-Y", *how, "-n", "chargehand", "-s", sig.name], input=message, capture_output=True).returncode == 0
text = open(sys.argv[1], "rb").read()
LINE = re.compile(r'\{"prev":"([0-9a-f]{64})","seq":(0|[1-9]\d*),"at":"(\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}(?:Z|[+-]\d\d:\d\d))","kind":"([a-z][a-z0-9-]{0,39})","body":(\{.*\})\}')
head, people, files, kind = "0" * 64, {}, [], None
wanted(text.endswith(b"\n"), "the last line is not whole")
for n, raw in enumerate(text[:-1].split(b"\n")):
    line = raw.decode("utf-8")
    wanted(len(raw) < 4 << 20 and not re.search("[\x00-\x1f\x7f-\x9f]", line), f"record {n}: too long, or a control character")
    m = LINE.fullmatch(line)
    wanted(m and m[1] == head and int(m[2]) == n and kind != "seal" and (m[4] == "opened") == (n == 0), f"record {n} does not follow")
    body, kind = json.loads(m[5], object_pairs_hook=pairs), m[4]
    if kind == "opened":
        opened = body
        wanted(body["format"] == "chargehand-log/1", "another format")
    if kind == "person": people[body["id"]] = body
    if kind == "file": files.append(body["sha256"])
    if kind in ("sign-off", "seal"):
        p = people[body["person"]]
        what = f"point: {body['point']}" if kind == "sign-off" else f"verdict: {body['verdict']}\nfiles: {' '.join(files) or '-'}"
        statement = (f"chargehand-statement/1\nlog: {opened['log']}\nmode: {opened['mode']}\nact: {kind}\n{what}\nperson: {p['id']} {p['name']}, {p['role']}\n"
                     f"record: {n}\nhead: {head}\nat: {m[3]}\n")
        wanted(body["statement"] == statement, f"record {n}: the statement is for another history")
        wanted(signed(statement.encode(), body["signature"]) if body["signature"] else body["unsigned_because"], f"record {n}: the signature does not hold")
    head = hashlib.sha256(raw + b"\n").hexdigest()
wanted(kind == "seal", f"no seal: cannot tell what followed record {n}")
who = subprocess.run(["ssh-keygen", "-Y", "find-principals", "-f", sys.argv[2], "-s", sys.argv[1] + ".sig"], capture_output=True, text=True).stdout.strip()
wanted(who and signed(text, open(sys.argv[1] + ".sig").read(), who), "the detached signature does not hold")
print(("REHEARSAL " if opened["mode"] == "rehearsal" else "") + f"{n + 1} records, complete to the seal, unchanged since {who} signed")

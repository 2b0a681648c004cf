#!/usr/bin/env python3
"""Digests of the example entries, found without any of our own code.

Reads every tests/reference/entries/*.json: the canonical bytes of one entry each, no newline at the end. Brings the
JSON into canonical form again (RFC 8785, package rfc8785), which must give the very same bytes, and prints for each
file the Merkle leaf hash SHA-256(0x00 || bytes) of RFC 9162, section 2.1.1:

    <leaf hash, hexadecimal> <kind> <version>

    pip install rfc8785
    python3 tests/independent/digest_entries.py            writes tests/reference/entries/digests.txt
    python3 tests/independent/digest_entries.py --check    compares with it and exits 1 on a difference
"""

import hashlib
import json
import pathlib
import sys

import rfc8785

ENTRIES = pathlib.Path(__file__).resolve().parent.parent / "reference" / "entries"


def no_floats(text):
    raise SystemExit(f"floating point in an entry: {text}")


def no_duplicates(pairs):
    members = dict(pairs)
    if len(members) != len(pairs):
        raise SystemExit(f"a member stands twice: {[name for name, _ in pairs]}")
    return members


def line(path):
    stored = path.read_bytes()
    entry = json.loads(stored, parse_float=no_floats, object_pairs_hook=no_duplicates)
    if rfc8785.dumps(entry) != stored:
        raise SystemExit(f"{path.name} is not in canonical form")
    leaf = hashlib.sha256(b"\x00" + stored).hexdigest()
    return f"{leaf} {entry['kind']} {entry['kv']}\n"


def main():
    lines = "".join(line(path) for path in sorted(ENTRIES.glob("*.json")))
    digests = ENTRIES / "digests.txt"
    if "--check" in sys.argv[1:]:
        if digests.read_text(encoding="ascii") != lines:
            raise SystemExit("digests.txt says otherwise")
        print(f"ok {lines.count(chr(10))} entries")
    else:
        digests.write_text(lines, encoding="ascii")


if __name__ == "__main__":
    main()

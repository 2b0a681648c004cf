#!/usr/bin/env python3
"""Checks a piece of ledger without any of our own code.

Reads one JSON object on standard input:

    {"vkey": "name+id+key",             the key to trust, from outside the ledger
     "checkpoint": "...",               the signed head, a C2SP signed note
     "entries": ["base64", ...],        all entries of the log, in order, as canonical bytes
     "proofs": [{"index": 3, "size": 8, "hashes": ["hex", ...]}, ...]}

and recomputes with the standard library, `cryptography` and `rfc8785`: that each entry is canonical JSON within the
ledger's profile, the root over all entries, every inclusion proof (of any size up to the head's), the signature.
Prints `ok N entries` and exits 0, or says what failed and exits 1.

    pip install cryptography rfc8785
    python3 tests/independent/check_ledger.py < export.json
"""

import base64
import hashlib
import json
import sys
import unicodedata

import rfc8785
from cryptography.exceptions import InvalidSignature
from cryptography.hazmat.primitives.asymmetric.ed25519 import Ed25519PublicKey

LARGEST_INTEGER = 2**53 - 1  # RFC 7493, section 2.2
LONGEST_ENTRY = 65_535  # C2SP tlog-tiles, entry bundles


class Failed(Exception):
    """What is wrong, in words."""


def require(condition, message):
    if not condition:
        raise Failed(message)


def unbase64(text):
    decoded = base64.b64decode(text, validate=True)
    require(base64.b64encode(decoded).decode() == text, "base64 in a second spelling")
    return decoded


# --- entries -------------------------------------------------------------------------------------------------------


def distinct(pairs):
    members = dict(pairs)
    require(len(members) == len(pairs), "a member stands twice")
    return members


def no_float(text):
    raise Failed(f"{text} is no integer")


def check_profile(value):
    """Strings, booleans, integers up to 2^53-1, arrays and objects; text in NFC without control characters."""
    if isinstance(value, str):
        require(unicodedata.is_normalized("NFC", value), "text not in normal form C")
        require(
            all(c == "\n" or unicodedata.category(c) != "Cc" for c in value), "a control character"
        )
    elif isinstance(value, bool):
        pass
    elif isinstance(value, int):
        require(abs(value) <= LARGEST_INTEGER, f"{value} is beyond 2^53-1")
    elif isinstance(value, list):
        for item in value:
            check_profile(item)
    elif isinstance(value, dict):
        for name, item in value.items():
            check_profile(name)
            check_profile(item)
    else:
        raise Failed(f"{value!r} never stands in the ledger")


def check_entry(data):
    require(len(data) <= LONGEST_ENTRY, f"{len(data)} bytes are too long")
    value = json.loads(
        data.decode("utf-8"),
        object_pairs_hook=distinct,
        parse_float=no_float,
        parse_constant=no_float,
    )
    check_profile(value)
    require(rfc8785.dumps(value) == data, "not in canonical form")


# --- the tree, RFC 9162 section 2.1 ----------------------------------------------------------------------------------


def leaf_hash(data):
    return hashlib.sha256(b"\x00" + data).digest()


def node_hash(left, right):
    return hashlib.sha256(b"\x01" + left + right).digest()


class Tree:
    """The definition itself: split at the largest power of two below the number of leaves."""

    def __init__(self, leaves):
        self.leaves = leaves
        self.known = {}

    def root(self, start, end):
        if start == end:
            return hashlib.sha256(b"").digest()
        if end - start == 1:
            return self.leaves[start]
        if (start, end) not in self.known:
            middle = start + (1 << ((end - start - 1).bit_length() - 1))
            self.known[start, end] = node_hash(self.root(start, middle), self.root(middle, end))
        return self.known[start, end]


def root_from_proof(leaf, index, size, hashes):
    """Goes down by the definition, then joins the hashes on the way back; none may be missing or to spare."""
    if size == 1:
        require(not hashes, "hashes to spare")
        return leaf
    require(hashes, "hashes are missing")
    middle = 1 << ((size - 1).bit_length() - 1)
    *inner, sibling = hashes
    if index < middle:
        return node_hash(root_from_proof(leaf, index, middle, inner), sibling)
    return node_hash(sibling, root_from_proof(leaf, index - middle, size - middle, inner))


# --- the signed head, C2SP signed-note and tlog-checkpoint -----------------------------------------------------------


def read_vkey(vkey):
    name, key_id, encoded = vkey.split("+", 2)
    data = unbase64(encoded)
    require(len(data) == 33 and data[0] == 1, "the verifier key is not one of Ed25519")
    computed = hashlib.sha256(name.encode() + b"\n" + data).digest()[:4]
    require(key_id == computed.hex(), "the verifier key's id is not that of its name and key")
    return name, computed, Ed25519PublicKey.from_public_bytes(data[1:])


def open_checkpoint(note, vkey):
    name, key_id, key = read_vkey(vkey)
    require(all(c == "\n" or c >= " " for c in note), "control characters in the checkpoint")
    require("\n\n" in note and note.endswith("\n"), "the checkpoint is not a signed note")
    body, lines = note.rsplit("\n\n", 1)
    body += "\n"
    good = 0
    for line in lines.removesuffix("\n").split("\n"):
        dash, signer, encoded = line.split(" ")
        require(dash == "\u2014", "a signature line does not begin with a dash")
        data = unbase64(encoded)
        if signer == name and data[:4] == key_id:
            try:
                key.verify(data[4:], body.encode())
            except InvalidSignature:
                raise Failed("the signature does not fit the checkpoint") from None
            good += 1
    require(good, "the checkpoint is not signed by the known key")
    origin, size, root, *_ = body.removesuffix("\n").split("\n")
    require(origin == name, f"the checkpoint is of the log {origin}, not of {name}")
    require(size.isascii() and size.isdigit() and str(int(size)) == size, "the size is no plain number")
    return int(size), unbase64(root)


# --- all together ----------------------------------------------------------------------------------------------------


def check(export):
    size, root = open_checkpoint(export["checkpoint"], export["vkey"])
    entries = [unbase64(text) for text in export["entries"]]
    require(len(entries) == size, f"{len(entries)} entries, but the signed head says {size}")
    for seq, data in enumerate(entries):
        try:
            check_entry(data)
        except (Failed, ValueError) as reason:
            raise Failed(f"entry {seq}: {reason}") from reason
    tree = Tree([leaf_hash(data) for data in entries])
    require(tree.root(0, size) == root, "the entries have another root than the signed head says")
    for proof in export["proofs"]:
        index, of_size = proof["index"], proof["size"]
        named = f"proof of entry {index} in {of_size}"
        require(0 <= index < of_size <= size, f"{named}: no such entry")
        hashes = [bytes.fromhex(text) for text in proof["hashes"]]
        require(all(len(h) == 32 for h in hashes), f"{named}: not a hash")
        try:
            found = root_from_proof(tree.leaves[index], index, of_size, hashes)
        except Failed as reason:
            raise Failed(f"{named}: {reason}") from reason
        require(found == tree.root(0, of_size), f"{named}: leads to another root")
    return len(entries)


def main():
    try:
        count = check(json.load(sys.stdin))
    except (Failed, ValueError, KeyError, TypeError) as reason:
        print(f"failed: {reason!r}" if not isinstance(reason, Failed) else f"failed: {reason}")
        return 1
    print(f"ok {count} entries")
    return 0


if __name__ == "__main__":
    sys.exit(main())

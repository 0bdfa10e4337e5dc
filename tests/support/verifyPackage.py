"""Checks an evidence package from its documented layout alone: standard library, and openssl for Ed25519.

Usage: verifyPackage.py FOLDER [VERIFIER-KEY]
"""

import base64
import hashlib
import json
import os
import subprocess
import sys
import tempfile


def sha(*parts):
    h = hashlib.sha256()
    for part in parts:
        h.update(part)
    return h.digest()


def read(folder, path):
    with open(os.path.join(folder, path), "rb") as file:
        return file.read()


def node(left, right):
    return sha(b"\x01", left, right)


def b64(text):
    return base64.b64decode(text, validate=True)


def canonical_b64(text):
    data = b64(text)
    assert base64.b64encode(data).decode() == text, "base64 that is not canonical"
    return data


def inclusion_root(leaf, index, size, path):
    """RFC 9162, 2.1.3.2."""
    assert 0 <= index < size, "index"
    fn, sn, r = index, size - 1, leaf
    for p in path:
        assert sn != 0, "path too long"
        if fn & 1 or fn == sn:
            r = node(p, r)
            while not fn & 1 and fn != 0:
                fn, sn = fn >> 1, sn >> 1
        else:
            r = node(r, p)
        fn, sn = fn >> 1, sn >> 1
    assert sn == 0, "path too short"
    return r


def consistency(first, second, path, first_root, second_root):
    """RFC 9162, 2.1.4.2."""
    assert 0 < first < second and path, "sizes"
    if first & (first - 1) == 0:
        path = [first_root] + path
    fn, sn = first - 1, second - 1
    while fn & 1:
        fn, sn = fn >> 1, sn >> 1
    fr = sr = path[0]
    for c in path[1:]:
        assert sn != 0, "path too long"
        if fn & 1 or fn == sn:
            fr, sr = node(c, fr), node(c, sr)
            while not fn & 1 and fn != 0:
                fn, sn = fn >> 1, sn >> 1
        else:
            sr = node(sr, c)
        fn, sn = fn >> 1, sn >> 1
    assert sn == 0 and fr == first_root and sr == second_root, "roots differ"


def ed25519(public_key, message, signature):
    der = bytes.fromhex("302a300506032b6570032100") + public_key
    with tempfile.TemporaryDirectory() as place:
        names = {}
        for name, data in (("key", der), ("message", message), ("signature", signature)):
            names[name] = os.path.join(place, name)
            with open(names[name], "wb") as file:
                file.write(data)
        done = subprocess.run(
            ["openssl", "pkeyutl", "-verify", "-pubin", "-keyform", "DER", "-inkey", names["key"], "-rawin",
             "-in", names["message"], "-sigfile", names["signature"]],
            capture_output=True, check=False)
        return done.returncode == 0


def read_keys(folder, trusted):
    keys = {}
    for line in read(folder, "keys/tree-head.txt").decode().splitlines():
        name, key_id, encoded = line.split("+", 2)
        data = canonical_b64(encoded)
        assert len(data) == 33 and data[0] == 1, "not an Ed25519 key"
        assert sha(name.encode() + b"\n", data)[:4].hex() == key_id, "key id"
        pem = read(folder, f"keys/tree-head-{key_id}.pem").decode().split("-----")
        assert pem[1] == "BEGIN PUBLIC KEY" and pem[3] == "END PUBLIC KEY", "PEM"
        assert b64(pem[2].replace("\n", ""))[-32:] == data[1:], "PEM of another key"
        if trusted in (None, line):
            keys[(name, key_id)] = data[1:]
    assert keys, "the trusted key is not here"
    return keys


def read_head(folder, name, keys, origin):
    note = read(folder, f"heads/{name}").decode("utf-8")
    text, signatures = note[: note.rindex("\n\n") + 1], note[note.rindex("\n\n") + 2:]
    assert signatures.endswith("\n"), "cut note"
    signed = False
    for line in signatures[:-1].split("\n"):
        dash, key_name, encoded = line.split(" ")
        assert dash == "\u2014", "signature line"
        data = canonical_b64(encoded)
        key = keys.get((key_name, data[:4].hex()))
        if key:
            assert ed25519(key, text.encode(), data[4:]), "signature"
            signed = True
    assert signed, "no trusted signature"
    lines = text.split("\n")
    assert lines[0] == origin and name == f"{lines[1]}.txt", "another head"
    root = canonical_b64(lines[2])
    assert len(root) == 32, "root"
    return int(lines[1]), root


def main(folder, trusted):
    manifest = json.loads(read(folder, "manifest.json"))
    assert manifest["format"] == "bellkeep-evidence/1", "format"
    for file in manifest["files"]:
        data = read(folder, file["path"])
        assert len(data) == file["bytes"] and sha(data).hex() == file["sha256"], file["path"]
    keys = read_keys(folder, trusted)
    heads = sorted(read_head(folder, name, keys, manifest["origin"]) for name in os.listdir(os.path.join(folder, "heads")))
    size, root = heads[-1]
    assert size == manifest["treeSize"], "tree size"
    for (older, older_root), (newer, newer_root) in zip(heads, heads[1:]):
        proof = json.loads(read(folder, f"consistency/{older}-{newer}.json"))
        assert (proof["from"], proof["to"]) == (older, newer), "another proof"
        consistency(older, newer, [bytes.fromhex(h) for h in proof["path"]], older_root, newer_root)
    lines = read(folder, "entries.jsonl").split(b"\n")
    assert lines.pop() == b"", "cut entries"
    entries = []
    for line in lines:
        entry = json.loads(line)
        proof = json.loads(read(folder, f"proofs/{entry['sequence']}.json"))
        leaf = sha(b"\x00", line)
        assert proof["sequence"] == entry["sequence"] and proof["treeSize"] == size, "another proof"
        assert proof["leafHash"] == leaf.hex(), "leaf"
        path = [bytes.fromhex(h) for h in proof["path"]]
        assert inclusion_root(leaf, entry["sequence"], size, path) == root, "not in the tree"
        entries.append(entry)
    sealed = [e for e in entries if e["kind"] == "sealed" and e["sequence"] == manifest["original"]["sealedSequence"]]
    assert sha(read(folder, manifest["original"]["path"])).hex() == sealed[0]["detail"]["sha256"], "original"
    said = [e for e in entries if e["kind"] == "measured"][-1]["detail"]["derived"]
    for picture in manifest["derived"]:
        assert sha(read(folder, picture["path"])).hex() == said[picture["kind"]], picture["path"]
    print(f"everything holds: {len(entries)} entries, {len(heads)} heads")


if __name__ == "__main__":
    try:
        main(sys.argv[1], sys.argv[2] if len(sys.argv) > 2 else None)
    except (AssertionError, ValueError, KeyError, IndexError, OSError) as error:
        print(f"WRONG: {error!r}")
        sys.exit(1)

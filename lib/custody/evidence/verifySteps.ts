import type { Evidence } from './gather';

/**
 * VERIFY.md: how to check the package with openssl and sha256sum, as commands that run as they stand in a POSIX shell,
 * and the layout of the package for whoever writes a verifier of their own.
 */
export function verifySteps(evidence: Evidence, originalPath: string): string {
  const size = evidence.heads.at(-1)?.size ?? 0;
  const key = evidence.treeKeys.at(-1)?.verifier ?? '';
  const sealed = evidence.original.sealedSequence;
  return `# Evidence of recording ${evidence.number}

This folder proves what happened to one recording, without Bellkeep and without a network. Compare this key with the
one that you were sent with the first letter of tree heads, or that a person you trust reads to you. If it is another
one, nothing below proves anything:

    ${key}

With Node 20 everything is checked by one command, in this folder:

    node verify.mjs . --key '${key}'

Below, the same is done by hand for the original and each entry. Run the blocks one after another in a shell, in this
folder, with \`openssl\` (3.0 or newer) and \`sha256sum\`. A block that ends in an error has found something wrong.

## 1. Every file is the one that was packed

\`\`\`sh
sha256sum --check --strict --quiet SHA256SUMS
\`\`\`

This alone proves nothing: whoever changes a file can change the list. It shows accidents.

## 2. The original is the one that was sealed

Entry ${sealed} of the log says what was sealed.

\`\`\`sh
sealed=$(grep '"sequence":${sealed},' entries.jsonl | sed 's/.*"sha256":"\\([0-9a-f]*\\)".*/\\1/')
echo "$sealed  ${originalPath}" | sha256sum --check --strict
\`\`\`

## 3. Each entry is in the tree of the head

The leaf of an entry is SHA-256 over a zero byte and the entry's line without its newline; a node is SHA-256 over a one
byte, the left hash and the right hash (RFC 9162, 2.1.1). The path in \`proofs/\` leads from the leaf to the root
(RFC 9162, 2.1.3.2).

\`\`\`sh
unhex() { for byte in $(echo "$1" | sed 's/../& /g'); do printf "\\\\$(printf '%03o' "0x$byte")"; done; }
sha() { sha256sum | cut -d ' ' -f 1; }
member() { tr -d ' \\n' < "$1" | sed "s/.*\\"$2\\":\\"\\{0,1\\}\\([0-9a-f]*\\).*/\\1/"; }
path_of() { tr -d ' \\n' < "$1" | sed 's/.*"path":\\[\\([^]]*\\)\\].*/\\1/' | tr -d '"' | tr ',' ' '; }
fold() {
  hash=$1 place=$2 last=$(($3 - 1)); shift 3
  for sibling in "$@"; do
    if [ $((place % 2)) -eq 1 ] || [ "$place" -eq "$last" ]; then
      hash=$({ printf '\\001'; unhex "$sibling"; unhex "$hash"; } | sha)
      while [ $((place % 2)) -eq 0 ] && [ "$place" -ne 0 ]; do place=$((place / 2)) last=$((last / 2)); done
    else
      hash=$({ printf '\\001'; unhex "$hash"; unhex "$sibling"; } | sha)
    fi
    place=$((place / 2)) last=$((last / 2))
  done
  [ "$last" -eq 0 ] && echo "$hash"
}
root=$(sed -n 3p heads/${size}.txt | openssl base64 -d -A | od -An -v -tx1 | tr -d ' \\n')
[ "$(sed -n 2p heads/${size}.txt)" = ${size} ]
\`\`\`

\`\`\`sh
while IFS= read -r line; do
  sequence=$(echo "$line" | sed 's/.*"sequence":\\([0-9]*\\),.*/\\1/')
  proof=proofs/$sequence.json
  leaf=$({ printf '\\000'; printf '%s' "$line"; } | sha)
  [ "$leaf" = "$(member "$proof" leafHash)" ] || { echo "entry $sequence is not what was hashed"; exit 1; }
  [ "$(member "$proof" treeSize)" = ${size} ] || { echo "the proof of entry $sequence is of another tree"; exit 1; }
  [ "$(fold "$leaf" "$sequence" ${size} $(path_of "$proof"))" = "$root" ] || { echo "entry $sequence is not in the tree"; exit 1; }
  echo "entry $sequence: in the tree"
done < entries.jsonl
\`\`\`

## 4. The heads are signed by the key

The signature (Ed25519, RFC 8032) is over the lines before the empty line, with their last newline.

\`\`\`sh
work=$(mktemp -d)
for head in heads/*.txt; do
  [ "$(sed -n 1p "$head")" = '${evidence.origin}' ]
  [ "$(tail -n 1 "$head" | cut -d ' ' -f 1,2)" = '— ${evidence.origin}' ] || { echo "$head is signed by another name"; exit 1; }
  id=$(tail -n 1 "$head" | sed 's/.* //' | openssl base64 -d -A | head -c 4 | od -An -v -tx1 | tr -d ' \\n')
  sed '/^$/,$d' "$head" > "$work/text"
  tail -n 1 "$head" | sed 's/.* //' | openssl base64 -d -A | tail -c 64 > "$work/signature"
  openssl pkeyutl -verify -pubin -inkey "keys/tree-head-$id.pem" -rawin -in "$work/text" -sigfile "$work/signature" || { echo "$head is not signed by that key"; exit 1; }
done
rm -r "$work"
\`\`\`

That the PEM file holds the key you compared above:

\`\`\`sh
grep -qxF '${key}' keys/tree-head.txt
id=$(echo '${key}' | cut -d + -f 2)
[ "$(openssl pkey -pubin -in "keys/tree-head-$id.pem" -outform DER | tail -c 32 | openssl base64 -A)" = "$(echo '${key}' | cut -d + -f 3- | openssl base64 -d -A | tail -c 32 | openssl base64 -A)" ]
\`\`\`

## What is in this folder

Hashes are SHA-256 in lower-case hex unless something else is said. Text is UTF-8 with newlines of one byte (0x0a).

| file | what it is |
| --- | --- |
| \`manifest.json\` | \`format\` ("bellkeep-evidence/1"), \`recording\`, \`madeAt\`, \`madeBy\`, \`reason\`, \`origin\` (name of the log), \`treeSize\`, \`original\` { path, mediaType, sealedSequence }, \`derived\` [ { kind, path } ], \`files\` [ { path, sha256, bytes } ]: every file but itself and \`SHA256SUMS\`. Its own hash stands in the log's entry that this package was made |
| \`SHA256SUMS\` | every file but itself, as sha256sum writes it |
| \`original/\` | the recording, byte for byte as the device sent it |
| \`derived/KIND.bin\` | pictures made from it; their hashes stand in the newest "measured" entry under \`detail.derived\` |
| \`entries.jsonl\` | the recording's entries and its device's enrolment, one a line, canonical JSON (RFC 8785), in the order of the log. The line without its newline is what the leaf is over |
| \`proofs/SEQUENCE.json\` | \`{ sequence, treeSize, leafHash, path }\`: inclusion of that entry in the tree of \`treeSize\` entries, \`path\` leaf first |
| \`heads/SIZE.txt\` | a signed head of the log at SIZE entries (C2SP checkpoint): name of the log, size, root in base64, an empty line, and the signature line \`— NAME BASE64(4-byte key id, 64-byte signature)\`. The largest is \`treeSize\` |
| \`consistency/FROM-TO.json\` | \`{ from, to, path }\`: the tree of TO holds the tree of FROM (RFC 9162, 2.1.4.2); one for each two heads that follow one another |
| \`keys/tree-head.txt\` | the keys of the log, one a line: \`NAME+KEYID+BASE64(0x01, 32-byte Ed25519 key)\`; KEYID is the first four bytes of SHA-256(NAME, 0x0a, 0x01, key) |
| \`keys/tree-head-KEYID.pem\` | the same keys for openssl |
| \`keys/device-token.jwks.json\` | keys by which device tokens were signed (RFC 7517) |
| \`device.json\` | the device as it was enrolled: \`assetTag\`, \`serialNumber\`, \`maker\`, \`model\`, \`udi\`, \`lot\`, \`firmware\`, \`enrolmentSequence\` (its entry, or null), \`thumbprint\` (RFC 7638), \`publicJwk\` (or null) |
| \`report.html\`, \`report.pdf\` | the same in words, for people |
| \`verify.mjs\` | checks all of it on bare Node 20, from this folder or from the archive |
`;
}

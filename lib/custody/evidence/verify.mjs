// Checks an evidence package of Bellkeep on bare Node 20: no packages, no network, one file that travels with the
// package. The layout is described in VERIFY.md.
//
//   node verify.mjs FOLDER-OR-ZIP [--key VERIFIER-KEY]
//
// Ends with 0 when everything holds, with 1 when something does not, with 2 when there is nothing to check.
import { createHash, createPublicKey, verify } from 'node:crypto';
import { readdirSync, readFileSync, statSync } from 'node:fs';
import { join, relative, sep } from 'node:path';
import { inflateRawSync } from 'node:zlib';

const sha256 = (...parts) => {
  const hash = createHash('sha256');
  for (const part of parts) hash.update(part);
  return hash.digest();
};
const fail = (message) => {
  throw new Error(message);
};

// --- where the files come from -------------------------------------------------------------------------------------

function fromFolder(folder) {
  const files = new Map();
  for (const entry of readdirSync(folder, { recursive: true, withFileTypes: true })) {
    if (entry.isDirectory()) continue;
    const path = join(entry.parentPath ?? entry.path, entry.name);
    files.set(relative(folder, path).split(sep).join('/'), readFileSync(path));
  }
  return files;
}

/** Files of an archive (APPNOTE.TXT, 4.3): stored or deflated, without encryption. */
function fromZip(bytes) {
  let end = bytes.length - 22;
  while (end >= 0 && bytes.readUInt32LE(end) !== 0x06054b50) end--;
  if (end < 0) fail('this is no ZIP archive');
  const count = bytes.readUInt16LE(end + 10);
  let at = bytes.readUInt32LE(end + 16);
  if (count === 0xffff || at === 0xffffffff)
    fail('the archive is too large for this reader: unpack it first');
  const files = new Map();
  for (let i = 0; i < count; i++) {
    if (bytes.readUInt32LE(at) !== 0x02014b50) fail('the directory of the archive is damaged');
    const method = bytes.readUInt16LE(at + 10);
    const packed = bytes.readUInt32LE(at + 20);
    const [nameLength, extraLength, commentLength] = [28, 30, 32].map((o) => bytes.readUInt16LE(at + o));
    const local = bytes.readUInt32LE(at + 42);
    const name = bytes.toString('utf8', at + 46, at + 46 + nameLength);
    at += 46 + nameLength + extraLength + commentLength;
    if (name.endsWith('/')) continue;
    const start = local + 30 + bytes.readUInt16LE(local + 26) + bytes.readUInt16LE(local + 28);
    const body = bytes.subarray(start, start + packed);
    if (method !== 0 && method !== 8) fail(`${name} is packed in a way that is not known here`);
    const path = name.split('/').slice(1).join('/');
    if (files.has(path)) fail(`${name} is in the archive twice`);
    files.set(path, method === 8 ? inflateRawSync(body) : Buffer.from(body));
  }
  return files;
}

// --- the log (RFC 9162, 2.1; C2SP signed-note and checkpoint) ------------------------------------------------------

const node = (left, right) => sha256(Buffer.from([1]), left, right);
const half = (n) => Math.floor(n / 2);

function unhex(text) {
  if (typeof text !== 'string' || !/^[0-9a-f]{64}$/.test(text))
    fail('a hash is not 64 digits of lower-case hex');
  return Buffer.from(text, 'hex');
}

function rootFromInclusion(leaf, index, size, path) {
  if (!Number.isSafeInteger(index) || index < 0 || index >= size)
    fail('the entry is not in a tree of that size');
  let [at, last, hash] = [index, size - 1, leaf];
  for (const sibling of path) {
    if (last === 0) fail('the path is too long');
    if (at % 2 === 1 || at === last) {
      hash = node(sibling, hash);
      while (at % 2 === 0 && at !== 0) [at, last] = [half(at), half(last)];
    } else hash = node(hash, sibling);
    [at, last] = [half(at), half(last)];
  }
  if (last !== 0) fail('the path is too short');
  return hash;
}

function checkConsistency(from, to, path, fromRoot, toRoot) {
  if (!(from > 0 && from < to) || path.length === 0) fail('the proof is of no two trees');
  let [fn, sn] = [from - 1, to - 1];
  while (fn % 2 === 1) [fn, sn] = [half(fn), half(sn)];
  const [first, ...rest] = fn === 0 ? [fromRoot, ...path] : path;
  let [fr, sr] = [first, first];
  for (const hash of rest) {
    if (sn === 0) fail('the path is too long');
    if (fn % 2 === 1 || fn === sn) {
      [fr, sr] = [node(hash, fr), node(hash, sr)];
      while (fn % 2 === 0 && fn !== 0) [fn, sn] = [half(fn), half(sn)];
    } else sr = node(sr, hash);
    [fn, sn] = [half(fn), half(sn)];
  }
  if (sn !== 0) fail('the path is too short');
  if (!fr.equals(fromRoot) || !sr.equals(toRoot)) fail('the path does not lead to both roots');
}

function readKey(line) {
  const [, name, id, encoded] = /^([^\s+]+)\+([0-9a-f]{8})\+([A-Za-z0-9+/=]+)$/.exec(line) ?? fail('no key');
  const bytes = Buffer.from(encoded, 'base64');
  if (bytes.length !== 33 || bytes[0] !== 1) fail('the key is not one of Ed25519');
  if (sha256(`${name}\n`, bytes).subarray(0, 4).toString('hex') !== id)
    fail('the id of the key is not its own');
  const x = bytes.subarray(1).toString('base64url');
  return { name, id, line, key: createPublicKey({ key: { kty: 'OKP', crv: 'Ed25519', x }, format: 'jwk' }) };
}

function readHead(note, keys, origin) {
  const cut = note.lastIndexOf('\n\n');
  if (cut < 0 || !note.endsWith('\n')) fail('it is no signed note');
  const text = note.slice(0, cut + 1);
  let signed = false;
  for (const line of note.slice(cut + 2, -1).split('\n')) {
    const [, name, encoded] =
      /^— ([^\s+]+) ([A-Za-z0-9+/=]+)$/u.exec(line) ?? fail('a signature line is none');
    const bytes = Buffer.from(encoded, 'base64');
    if (bytes.toString('base64') !== encoded) fail('a signature is not written in the one canonical way');
    const id = bytes.subarray(0, 4).toString('hex');
    const known = keys.find((key) => key.name === name && key.id === id);
    if (!known) continue;
    if (!verify(null, Buffer.from(text), known.key, bytes.subarray(4)))
      fail('the signature is not of this text');
    signed = true;
  }
  if (!signed) fail('no key that is trusted here has signed it');
  const [name, decimal, encoded, ...more] = text.split('\n');
  const root = Buffer.from(encoded ?? '', 'base64');
  if (name !== origin) fail(`it is of the log ${name}`);
  if (!/^(0|[1-9]\d*)$/.test(decimal) || root.length !== 32 || more.at(-1) !== '') fail('it is no tree head');
  return { size: Number(decimal), root };
}

// --- the checks ----------------------------------------------------------------------------------------------------

let wrong = 0;
function check(title, work) {
  try {
    const value = work();
    console.log(`  right  ${title}${value ? `: ${value}` : ''}`);
    return true;
  } catch (error) {
    wrong++;
    console.log(`  WRONG  ${title}: ${error.message}`);
    return false;
  }
}

function main() {
  const args = process.argv.slice(2);
  const at = args.indexOf('--key');
  const [trustedLine] = at < 0 ? [] : args.splice(at, 2).slice(1);
  const [place] = args;
  if (!place) {
    console.error('node verify.mjs FOLDER-OR-ZIP [--key VERIFIER-KEY]');
    return 2;
  }
  const files = statSync(place).isDirectory() ? fromFolder(place) : fromZip(readFileSync(place));
  const bytesOf = (path) => files.get(path) ?? fail(`${path} is not there`);
  const textOf = (path) => new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(bytesOf(path));
  const jsonOf = (path) => JSON.parse(textOf(path));
  let manifest;
  if (!check('manifest.json is read', () => readManifest())) return 1;
  function readManifest() {
    manifest = jsonOf('manifest.json');
    if (manifest.format !== 'bellkeep-evidence/1') fail(`the format ${manifest.format} is not known here`);
    return `${manifest.recording}, made ${manifest.madeAt}`;
  }
  checkFiles(files, manifest, bytesOf, textOf);
  const keys = checkKeys(manifest, trustedLine, textOf, files);
  const heads = checkHeads(files, manifest, keys, textOf);
  checkConsistencies(files, heads, jsonOf);
  const entries = checkEntries(files, manifest, heads.at(-1), textOf, jsonOf);
  checkObjects(manifest, entries, bytesOf);
  checkDevice(entries, jsonOf);
  console.log(
    wrong === 0 ? 'Everything holds.' : `${wrong} ${wrong === 1 ? 'check does' : 'checks do'} not hold.`,
  );
  if (wrong === 0 && !trustedLine)
    console.log(
      'The key came with the package. Compare it with one you were given otherwise, or give it with --key.',
    );
  return wrong === 0 ? 0 : 1;
}

function checkFiles(files, manifest, bytesOf, textOf) {
  check('every file is listed, and is as it is listed', () => {
    const listed = new Set(['manifest.json', 'SHA256SUMS']);
    for (const { path, sha256: expected, bytes } of manifest.files) {
      const body = bytesOf(path);
      if (body.length !== bytes || sha256(body).toString('hex') !== expected) fail(`${path} is another file`);
      if (listed.has(path)) fail(`${path} is listed twice`);
      listed.add(path);
    }
    for (const path of files.keys()) if (!listed.has(path)) fail(`${path} does not belong here`);
    return `${files.size} files`;
  });
  check('SHA256SUMS lists the same', () => {
    const lines = textOf('SHA256SUMS').split('\n');
    if (lines.pop() !== '') fail('its last line is cut');
    const sums = new Map(lines.map((line) => [line.slice(66), line.slice(0, 64)]));
    for (const { path, sha256: expected } of manifest.files)
      if (sums.get(path) !== expected) fail(`${path} has another sum`);
    if (sums.get('manifest.json') !== sha256(bytesOf('manifest.json')).toString('hex'))
      fail('manifest.json is another file');
    if (sums.size !== manifest.files.length + 1 || lines.length !== sums.size) fail('it lists more or less');
  });
}

function checkKeys(manifest, trustedLine, textOf, files) {
  let keys = [];
  check('keys of the log are read', () => {
    keys = textOf('keys/tree-head.txt').trimEnd().split('\n').map(readKey);
    for (const { name, id, key } of keys) {
      if (name !== manifest.origin) fail(`a key is of ${name}`);
      const pem = textOf(`keys/tree-head-${id}.pem`);
      if (!createPublicKey(pem).equals(key)) fail(`tree-head-${id}.pem is another key`);
    }
    const pems = [...files.keys()].filter((path) => path.endsWith('.pem'));
    if (pems.length !== keys.length) fail('a key is there that is not listed');
    return keys.map(({ line }) => line).join(' ');
  });
  if (trustedLine)
    check('the key you gave is among them', () => {
      keys = keys.filter(({ line }) => line === trustedLine);
      if (keys.length === 0) fail('it is not: nothing here is signed by it');
    });
  return keys;
}

function checkHeads(files, manifest, keys, textOf) {
  const heads = [];
  const paths = [...files.keys()].filter((path) => path.startsWith('heads/'));
  for (const path of paths)
    check(`${path} is signed`, () => {
      const head = readHead(textOf(path), keys, manifest.origin);
      if (path !== `heads/${head.size}.txt`) fail(`it is of ${head.size} entries`);
      heads.push(head);
      return `${head.size} entries, root ${head.root.toString('hex')}`;
    });
  heads.sort((a, b) => a.size - b.size);
  check('the newest head is the one of the proofs', () => {
    if (heads.at(-1)?.size !== manifest.treeSize) fail(`there is no head of ${manifest.treeSize} entries`);
  });
  return heads;
}

function checkConsistencies(files, heads, jsonOf) {
  for (let i = 1; i < heads.length; i++) {
    const [older, newer] = [heads[i - 1], heads[i]];
    check(`the head of ${newer.size} holds the head of ${older.size}`, () => {
      const { from, to, path } = jsonOf(`consistency/${older.size}-${newer.size}.json`);
      if (from !== older.size || to !== newer.size) fail('the proof is of other heads');
      checkConsistency(from, to, path.map(unhex), older.root, newer.root);
      return `${path.length} hashes`;
    });
  }
  const proofs = [...files.keys()].filter((path) => path.startsWith('consistency/')).length;
  if (proofs !== Math.max(0, heads.length - 1))
    check('there is one proof for each two heads', () => fail(`there are ${proofs}`));
}

function checkEntries(files, manifest, head, textOf, jsonOf) {
  const entries = [];
  let lines = [];
  check('entries are lines of JSON, in the order of the log', () => {
    lines = textOf('entries.jsonl').split('\n');
    if (lines.pop() !== '' || lines.length === 0) fail('the last line is cut');
    for (const line of lines) {
      const entry = JSON.parse(line);
      if (!Number.isSafeInteger(entry.sequence)) fail('an entry has no number');
      if (entries.length > 0 && entry.sequence <= entries.at(-1).sequence)
        fail(`entry ${entry.sequence} stands wrong`);
      entries.push(entry);
    }
    return `${lines.length} entries`;
  });
  for (const [i, entry] of entries.entries())
    check(`entry ${entry.sequence} (${entry.kind}) is in the tree`, () => {
      const { sequence, treeSize, leafHash, path } = jsonOf(`proofs/${entry.sequence}.json`);
      const leaf = sha256(Buffer.from([0]), Buffer.from(lines[i], 'utf8'));
      if (sequence !== entry.sequence || treeSize !== manifest.treeSize)
        fail('the proof is of another place');
      if (leafHash !== leaf.toString('hex')) fail('it is not the text that was hashed');
      const root = rootFromInclusion(leaf, sequence, treeSize, path.map(unhex));
      if (!head || !root.equals(head.root)) fail('the path does not lead to the root of the head');
      return leafHash;
    });
  const proofs = [...files.keys()].filter((path) => path.startsWith('proofs/')).length;
  if (proofs !== entries.length)
    check('there is one proof for each entry', () => fail(`there are ${proofs}`));
  return entries;
}

function checkObjects(manifest, entries, bytesOf) {
  check('the original is the one that was sealed', () => {
    const sealed = entries.find(
      ({ kind, sequence }) => kind === 'sealed' && sequence === manifest.original.sealedSequence,
    );
    if (!sealed) fail('no entry says what was sealed');
    if (sealed.detail.number !== manifest.recording) fail(`the entry is of ${sealed.detail.number}`);
    const body = bytesOf(manifest.original.path);
    const hash = sha256(body).toString('hex');
    if (hash !== sealed.detail.sha256) fail(`it hashes to ${hash}; ${sealed.detail.sha256} was sealed`);
    if (body.length !== sealed.detail.bytes)
      fail(`it has ${body.length} bytes; ${sealed.detail.bytes} were sealed`);
    return hash;
  });
  const measured = entries.filter(({ kind }) => kind === 'measured').at(-1);
  check('the pictures are those that were measured', () => {
    const said = measured?.detail.derived ?? {};
    for (const { kind, path } of manifest.derived)
      if (sha256(bytesOf(path)).toString('hex') !== said[kind]) fail(`${path} is another picture`);
    if (manifest.derived.length !== Object.keys(said).length) fail('there are more or fewer than were made');
    return `${manifest.derived.length}`;
  });
}

/** RFC 7638 thumbprint of a public key. */
function thumbprintOf(jwk) {
  const members = { EC: ['crv', 'kty', 'x', 'y'], OKP: ['crv', 'kty', 'x'], RSA: ['e', 'kty', 'n'] }[jwk.kty];
  if (!members) fail(`keys of the kind ${jwk.kty} are not known here`);
  return sha256(JSON.stringify(Object.fromEntries(members.map((name) => [name, jwk[name]])))).toString(
    'base64url',
  );
}

function checkDevice(entries, jsonOf) {
  check('the device is the one that was enrolled', () => {
    const device = jsonOf('device.json');
    if (device.enrolmentSequence === null) return 'the log holds no enrolment of it';
    const enrolled = entries.find(
      ({ kind, sequence }) => kind === 'device-enrolled' && sequence === device.enrolmentSequence,
    );
    if (!enrolled) fail('no entry says that it was enrolled');
    if (enrolled.detail.thumbprint !== device.thumbprint) fail('it enrolled with another key');
    if (enrolled.detail.serialNumber !== device.serialNumber) fail('its serial number is another one');
    if (device.publicJwk && thumbprintOf(device.publicJwk) !== device.thumbprint)
      fail('its key is another one');
    return `${device.assetTag}, key ${device.thumbprint}`;
  });
}

try {
  process.exitCode = main();
} catch (error) {
  console.error(`It could not be checked: ${error.message}`);
  process.exitCode = 1;
}

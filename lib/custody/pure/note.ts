import { fromBase64, toBase64 } from './base64';
import { CustodyError } from './errors';
import { fromHex, hex, sameBytes, sha256 } from './hash';

/** A public key by which signed notes are checked (C2SP signed-note, Ed25519). */
export interface Verifier {
  name: string;
  /** Four bytes in hex. */
  keyId: string;
  /** 32 bytes. */
  publicKey: Uint8Array;
}

interface NoteSignature {
  name: string;
  keyId: string;
  signature: Uint8Array;
}

export interface SignedNote {
  /** What is signed: the lines with their last newline, without the empty line. */
  text: string;
  signatures: NoteSignature[];
}

const ED25519 = 1;
const DASH = '— ';
// A name holds no space and no plus (C2SP signed-note, "Format").
const NAME = /^[^\s+]+$/u;

const utf8 = (text: string): Uint8Array => new TextEncoder().encode(text);

function joined(...parts: Uint8Array[]): Uint8Array {
  const all = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    all.set(part, at);
    at += part.length;
  }
  return all;
}

/** First four bytes of SHA-256(name || "\n" || 0x01 || public key), in hex. */
async function keyIdOf(name: string, publicKey: Uint8Array): Promise<string> {
  return hex((await sha256(joined(utf8(`${name}\n`), Uint8Array.of(ED25519), publicKey))).subarray(0, 4));
}

/** The key as one line: `<name>+<key id>+<base64(0x01 || public key)>`. */
export async function verifierKey(name: string, publicKey: Uint8Array): Promise<string> {
  if (!NAME.test(name) || publicKey.length !== 32)
    throw new CustodyError('key-malformed', 'a name without spaces and a key of 32 bytes');
  const id = await keyIdOf(name, publicKey);
  return `${name}+${id}+${toBase64(joined(Uint8Array.of(ED25519), publicKey))}`;
}

/** @throws CustodyError `key-malformed` also where the key id does not belong to name and key */
export async function parseVerifier(line: string): Promise<Verifier> {
  const [, name = '', keyId = '', encoded = ''] =
    /^([^\s+]+)\+([0-9a-f]{8})\+([A-Za-z0-9+/=]+)$/u.exec(line.trim()) ?? [];
  const bytes = fromBase64(encoded);
  if (name === '' || !bytes || bytes.length !== 33 || bytes[0] !== ED25519)
    throw new CustodyError('key-malformed', 'a verifier key is NAME+ID+KEY with an Ed25519 key');
  const publicKey = bytes.subarray(1);
  const expected = await keyIdOf(name, publicKey);
  if (expected !== keyId)
    throw new CustodyError('key-malformed', `the key's id is ${expected}, the line says ${keyId}`);
  return { name, keyId, publicKey };
}

/** The signature line of a note. @param signature 64 bytes over the text (RFC 8032, 5.1.6) */
export async function signatureLine(
  name: string,
  publicKey: Uint8Array,
  signature: Uint8Array,
): Promise<string> {
  const id = fromHex(await keyIdOf(name, publicKey)) ?? new Uint8Array(0);
  return `${DASH}${name} ${toBase64(joined(id, signature))}\n`;
}

function parseSignature(line: string): NoteSignature {
  const [, name = '', encoded = ''] = /^— ([^\s+]+) ([A-Za-z0-9+/=]+)$/u.exec(line) ?? [];
  const bytes = fromBase64(encoded);
  if (name === '' || !bytes || bytes.length < 5)
    throw new CustodyError('note-malformed', 'a signature line is not "— NAME BASE64"');
  return { name, keyId: hex(bytes.subarray(0, 4)), signature: bytes.subarray(4) };
}

/** Take a signed note apart (C2SP signed-note). Nothing is checked yet. @throws CustodyError `note-malformed` */
export function parseNote(note: string): SignedNote {
  // biome-ignore lint/suspicious/noControlCharactersInRegex: the format forbids them
  if (/[\u0000-\u0009\u000b-\u001f\ufffd]/.test(note))
    throw new CustodyError('note-malformed', 'a note holds no control characters but newlines');
  const cut = note.lastIndexOf('\n\n');
  const lines = cut < 0 ? [] : note.slice(cut + 2).split('\n');
  if (lines.length < 2 || lines.pop() !== '')
    throw new CustodyError(
      'note-malformed',
      'a note is text, an empty line and signatures, each line ended by a newline',
    );
  return { text: note.slice(0, cut + 1), signatures: lines.map(parseSignature) };
}

/** Whether this browser or Node checks Ed25519 signatures by itself. */
export async function hasEd25519(): Promise<boolean> {
  try {
    // RFC 8032, 7.1, test 1: any valid public key will do.
    const key = fromHex('d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a');
    await crypto.subtle.importKey('raw', key as Uint8Array<ArrayBuffer>, 'Ed25519', false, ['verify']);
    return true;
  } catch {
    return false;
  }
}

/**
 * Ed25519 (RFC 8032, 5.1.7) by WebCrypto.
 *
 * @throws CustodyError `ed25519-missing` where the browser cannot
 */
export async function verifyEd25519(
  publicKey: Uint8Array,
  message: Uint8Array,
  signature: Uint8Array,
): Promise<boolean> {
  if (!(await hasEd25519()))
    throw new CustodyError('ed25519-missing', 'this browser does not check Ed25519 signatures');
  try {
    const key = await crypto.subtle.importKey('raw', publicKey as Uint8Array<ArrayBuffer>, 'Ed25519', false, [
      'verify',
    ]);
    return await crypto.subtle.verify(
      'Ed25519',
      key,
      signature as Uint8Array<ArrayBuffer>,
      message as Uint8Array<ArrayBuffer>,
    );
  } catch {
    // A key that is no point of the curve.
    return false;
  }
}

/**
 * Check a signed note against keys one trusts. Signatures of other keys are passed over; one of a trusted key that does
 * not verify is an error, whatever else stands there (C2SP signed-note, "Verification").
 *
 * @returns the signed text and the keys that signed it
 * @throws CustodyError `note-malformed`, `note-signature`, `note-unsigned`, `ed25519-missing`
 */
export async function verifyNote(
  note: string,
  trusted: readonly Verifier[],
): Promise<{ text: string; by: Verifier[] }> {
  const { text, signatures } = parseNote(note);
  const by: Verifier[] = [];
  for (const one of signatures) {
    const key = trusted.find(({ name, keyId }) => name === one.name && keyId === one.keyId);
    if (!key) continue;
    if (!(await verifyEd25519(key.publicKey, utf8(text), one.signature)))
      throw new CustodyError(
        'note-signature',
        `the signature of ${key.name} ${key.keyId} is not of this text`,
      );
    if (!by.some(({ publicKey }) => sameBytes(publicKey, key.publicKey))) by.push(key);
  }
  if (by.length === 0)
    throw new CustodyError('note-unsigned', 'no signature is by a key that is trusted here');
  return { text, by };
}

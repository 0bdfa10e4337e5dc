import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { fromBase64, toBase64 } from '@/lib/custody/pure/base64';
import { CustodyError } from '@/lib/custody/pure/errors';
import { fromHex } from '@/lib/custody/pure/hash';
import { findHeads, headText, parseHeadText, verifyHead } from '@/lib/custody/pure/head';
import {
  parseNote,
  parseVerifier,
  signatureLine,
  type Verifier,
  verifierKey,
  verifyEd25519,
  verifyNote,
} from '@/lib/custody/pure/note';

const codeOf = async (check: Promise<unknown> | (() => unknown)): Promise<string> => {
  try {
    await (typeof check === 'function' ? check() : check);
    return 'accepted';
  } catch (error) {
    if (error instanceof CustodyError) return error.code;
    throw error;
  }
};
const bytes = (text: string) => fromHex(text) as Uint8Array;

// RFC 8032, 7.1, tests 1 to 3, from memory: public key, message, signature.
const ED25519 = [
  [
    'd75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a',
    '',
    'e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b',
  ],
  [
    '3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c',
    '72',
    '92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da085ac1e43e15996e458f3613d0f11d8c387b2eaeb4302aeeb00d291612bb0c00',
  ],
  [
    'fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025',
    'af82',
    '6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac18ff9b538d16f290ae67f760984dc6594a7c15e9716ed28dc027beceea1ec40a',
  ],
] as const;

test.each(ED25519)(
  'the published signature of %s is accepted, and with one bit turned it is not',
  async (key, message, signature) => {
    expect(await verifyEd25519(bytes(key), bytes(message), bytes(signature))).toBe(true);
    for (const at of [0, 31, 32, 63]) {
      const wrong = bytes(signature);
      wrong[at] = (wrong[at] ?? 0) ^ 1;
      expect(await verifyEd25519(bytes(key), bytes(message), wrong)).toBe(false);
    }
    expect(await verifyEd25519(bytes(key), bytes(`${message}00`), bytes(signature))).toBe(false);
  },
);

// The example of the Go project's note package (golang.org/x/mod/sumdb/note), from memory; its signature verifies.
const KEY = 'PeterNeumann+c74f20a3+ARpc2QcUPDhMQegwxbzhKqiBfsVkmqq/LDE4izWy10TW';
const NOTE = `If you think cryptography is the answer to your problem,
then you don't know what your problem is.

— PeterNeumann x08go/ZJkuBS9UG/SffcvIAQxVBtiFupLLr8pAcElZInNIuGUgYN1FFYC2pZSNXgKvqfqdngotpRZb6KE6RyyBwJnAM=
`;

describe('a signed note (C2SP signed-note)', () => {
  test('the published note is signed by the published key, and the key is written as published', async () => {
    const key = await parseVerifier(KEY);
    const { text, by } = await verifyNote(NOTE, [key]);
    expect(text).toBe(NOTE.slice(0, NOTE.indexOf('\n\n') + 1));
    expect(by).toEqual([key]);
    expect(await verifierKey(key.name, key.publicKey)).toBe(KEY);
  });

  test('a changed letter, a missing newline or another key is refused, each by its name', async () => {
    const key = await parseVerifier(KEY);
    expect(await codeOf(verifyNote(NOTE.replace('answer', 'Answer'), [key]))).toBe('note-signature');
    expect(await codeOf(verifyNote(NOTE, []))).toBe('note-unsigned');
    expect(await codeOf(verifyNote(NOTE, [{ ...key, name: 'Somebody' }]))).toBe('note-unsigned');
    expect(await codeOf(() => parseNote(NOTE.trimEnd()))).toBe('note-malformed');
    expect(await codeOf(() => parseNote(NOTE.replace('\n\n', '\n')))).toBe('note-malformed');
    expect(await codeOf(() => parseNote(NOTE.replace('— ', '- ')))).toBe('note-malformed');
    expect(await codeOf(() => parseNote(NOTE.replace('problem', 'prob\u0007lem')))).toBe('note-malformed');
  });

  test('a wrong signature of a trusted key is not made good by a right one beside it', async () => {
    const key = await parseVerifier(KEY);
    const line = NOTE.split('\n').at(-2) ?? '';
    const broken = line.replace('x08go/ZJ', 'x08go/ZK');
    expect(await codeOf(verifyNote(`${NOTE}${broken}\n`, [key]))).toBe('note-signature');
  });

  test('a key whose id is not its own is refused', async () => {
    expect(await codeOf(parseVerifier(KEY.replace('c74f20a3', 'c74f20a4')))).toBe('key-malformed');
    expect(await codeOf(parseVerifier(KEY.replace('PeterNeumann', 'Peter')))).toBe('key-malformed');
    expect(await codeOf(parseVerifier('no key at all'))).toBe('key-malformed');
    expect(await codeOf(verifierKey('two words', new Uint8Array(32)))).toBe('key-malformed');
  });
});

async function signerOf(name: string): Promise<{ verifier: Verifier; sign(text: string): Promise<string> }> {
  const pair = (await crypto.subtle.generateKey('Ed25519', true, ['sign', 'verify'])) as CryptoKeyPair;
  const publicKey = new Uint8Array(await crypto.subtle.exportKey('raw', pair.publicKey));
  return {
    verifier: await parseVerifier(await verifierKey(name, publicKey)),
    async sign(text) {
      const signature = await crypto.subtle.sign('Ed25519', pair.privateKey, Buffer.from(text, 'utf8'));
      return `${text}\n${await signatureLine(name, publicKey, new Uint8Array(signature))}`;
    },
  };
}

const ORIGIN = 'bellkeep.example.org/custody';

describe('a tree head (C2SP checkpoint)', () => {
  test('any size and root are read as they were written', () => {
    fc.assert(
      fc.property(fc.maxSafeNat(), fc.uint8Array({ minLength: 32, maxLength: 32 }), (size, root) => {
        expect(parseHeadText(headText(ORIGIN, size, root))).toEqual({ origin: ORIGIN, size, root });
      }),
    );
  });

  test('what is no head is refused: leading zeros, signs, roots of another length, lines missing', async () => {
    const root = toBase64(new Uint8Array(32));
    for (const text of [
      `${ORIGIN}\n05\n${root}\n`,
      `${ORIGIN}\n-5\n${root}\n`,
      `${ORIGIN}\n5e3\n${root}\n`,
      `${ORIGIN}\n99999999999999999999\n${root}\n`,
      `${ORIGIN}\n5\n${toBase64(new Uint8Array(31))}\n`,
      `${ORIGIN}\n5\n${root.replace('=', '')}\n`,
      `\n5\n${root}\n`,
      `${ORIGIN}\n5\n`,
      '',
    ])
      expect(await codeOf(() => parseHeadText(text)), JSON.stringify(text)).toBe('head-malformed');
  });

  test('a head of another log is refused though its key is trusted', async () => {
    const { verifier, sign } = await signerOf(ORIGIN);
    const ours = await sign(headText(ORIGIN, 5, new Uint8Array(32)));
    const theirs = await sign(headText('elsewhere.example/custody', 5, new Uint8Array(32)));
    expect((await verifyHead(ours, ORIGIN, [verifier])).size).toBe(5);
    expect(await codeOf(verifyHead(theirs, ORIGIN, [verifier]))).toBe('head-origin');
    expect(await codeOf(verifyHead(ours.replace('\n5\n', '\n6\n'), ORIGIN, [verifier]))).toBe(
      'note-signature',
    );
  });

  test('heads are found in a letter, quoted or not, among other text', async () => {
    const { sign } = await signerOf(ORIGIN);
    const heads = [
      await sign(headText(ORIGIN, 5, new Uint8Array(32))),
      await sign(headText(ORIGIN, 9, new Uint8Array(32).fill(7))),
    ];
    const letter = `From: Bellkeep\r\n\r\nKeep this.\n\n${heads.join('\n')}\nRegards`;
    expect(findHeads(letter, ORIGIN)).toEqual(heads);
    const quoted = heads
      .join('\n')
      .split('\n')
      .map((line) => `> ${line}`)
      .join('\r\n');
    expect(findHeads(quoted, ORIGIN)).toEqual(heads);
    expect(findHeads(letter, 'elsewhere.example/custody')).toEqual([]);
    expect(findHeads(`${ORIGIN}\nis the name of our log\n`, ORIGIN)).toEqual([]);
  });
});

test('base64 is taken in its one canonical way only', () => {
  fc.assert(
    fc.property(fc.uint8Array(), (some) => {
      expect(toBase64(some)).toBe(Buffer.from(some).toString('base64'));
      expect(fromBase64(toBase64(some))).toEqual(some);
    }),
  );
  for (const text of ['A', 'AA=', 'AB==', 'AA-_', ' AAAA', 'AAAA\n']) expect(fromBase64(text)).toBeNull();
});

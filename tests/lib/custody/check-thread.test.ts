import { createHash } from 'node:crypto';
import { beforeAll, describe, expect, test } from 'vitest';
import {
  type Check,
  type CheckedThread,
  type CheckId,
  checkOriginal,
  checkThread,
  type Sources,
} from '@/lib/custody/pure/checkThread';
import { compareHeads } from '@/lib/custody/pure/compareHeads';
import { hex } from '@/lib/custody/pure/hash';
import { headText } from '@/lib/custody/pure/head';
import { signatureLine, verifierKey } from '@/lib/custody/pure/note';
import { naiveConsistency, naiveInclusion, naiveLeaf, naiveRoot } from '@/tests/support/naiveTree';

const ORIGIN = 'bellkeep.example.org/custody';
const ORIGINAL = Buffer.from('the bytes of a recording');
const SHA256 = createHash('sha256').update(ORIGINAL).digest('hex');
const LOG = Array.from({ length: 23 }, (_, i) =>
  JSON.stringify(i === 4 ? { kind: 'sealed', detail: { sha256: SHA256 } } : { kind: 'heard', i }),
);
const LEAVES = LOG.map((text) => naiveLeaf(Buffer.from(text)));

let pair: CryptoKeyPair;
let key: string;
async function sign(size: number, root = naiveRoot(LEAVES.slice(0, size)), origin = ORIGIN): Promise<string> {
  const text = headText(origin, size, root);
  const publicKey = new Uint8Array(await crypto.subtle.exportKey('raw', pair.publicKey));
  const signature = new Uint8Array(await crypto.subtle.sign('Ed25519', pair.privateKey, Buffer.from(text)));
  return `${text}\n${await signatureLine(origin, publicKey, signature)}`;
}
beforeAll(async () => {
  pair = (await crypto.subtle.generateKey('Ed25519', true, ['sign', 'verify'])) as CryptoKeyPair;
  key = await verifierKey(ORIGIN, new Uint8Array(await crypto.subtle.exportKey('raw', pair.publicKey)));
});

const thread = (): CheckedThread => ({
  sha256: SHA256,
  entries: [19, 11, 4].map((sequence) => ({
    sequence,
    canonical: LOG[sequence] as string,
    leafHash: hex(LEAVES[sequence] as Uint8Array),
  })),
});
const honest = async (): Promise<Sources> => {
  const rows = [
    { size: 21, note: await sign(21) },
    { size: 9, note: await sign(9) },
  ];
  return {
    heads: async () => ({ origin: ORIGIN, rows }),
    keys: async () => [key],
    inclusion: async (sequences, size) =>
      sequences.map((sequence) => ({
        sequence,
        path: naiveInclusion(sequence, LEAVES.slice(0, size)).map(hex),
      })),
    consistency: async (from, to) => naiveConsistency(from, LEAVES.slice(0, to)).map(hex),
    locked: async () => rows[0]?.note ?? null,
    original: async () => ORIGINAL,
  };
};

async function run(
  more: Partial<Sources> = {},
  of: CheckedThread = thread(),
  held?: string,
): Promise<Record<CheckId, Check>> {
  const sources = { ...(await honest()), ...more };
  const checks = {} as Record<CheckId, Check>;
  const report = (check: Check) => {
    checks[check.id] = check;
  };
  await checkThread(of, sources, report, held);
  await checkOriginal(of, sources, report);
  return checks;
}
const wrong = (checks: Record<CheckId, Check>) =>
  Object.values(checks)
    .filter((check) => check.state !== 'right')
    .map((check) => `${check.id} ${check.state}`);

test('an honest thread is right in every check, with the values that were computed', async () => {
  const checks = await run();
  expect(wrong(checks)).toEqual([]);
  expect(checks.leaves.value).toBe('3 of 3');
  expect(checks.consistency.value).toBe('9 → 21');
  expect(checks.original.detail).toContain(SHA256);
});

describe('one tampered byte', () => {
  test('of the original is wrong, loudly, with both hashes', async () => {
    const checks = await run({ original: async () => Buffer.from('the bytes of a recordinG') });
    expect(wrong(checks)).toEqual(['original wrong']);
    expect(checks.original.detail).toContain(SHA256);
  });
  test('of an entry breaks its leaf and its inclusion', async () => {
    const of = thread();
    const entries = of.entries.map((entry, i) =>
      i === 1 ? { ...entry, canonical: entry.canonical.replace('heard', 'Heard') } : entry,
    );
    expect(wrong(await run({}, { ...of, entries }))).toEqual(['leaves wrong', 'inclusion wrong']);
  });
  test('of an entry whose leaf hash was changed with it still breaks its inclusion', async () => {
    const of = thread();
    const canonical = '{"kind":"heard","i":"another"}';
    const entries = [
      { sequence: 11, canonical, leafHash: hex(naiveLeaf(Buffer.from(canonical))) },
      ...of.entries.slice(2),
    ];
    expect(wrong(await run({}, { ...of, entries }))).toEqual(['inclusion wrong']);
  });
  test('of the sealed hash in the recording’s row is passed over for the entry’s', async () => {
    expect(wrong(await run({}, { ...thread(), sha256: '0'.repeat(64) }))).toEqual([]);
  });
  test('of a head breaks its signature, and nothing is said of what hangs on it', async () => {
    const note = (await sign(21)).replace('\n21\n', '\n22\n');
    const checks = await run({ heads: async () => ({ origin: ORIGIN, rows: [{ size: 22, note }] }) });
    expect(wrong(checks)).toEqual([
      'signature wrong',
      'inclusion unchecked',
      'consistency unchecked',
      'locked unchecked',
    ]);
    expect(checks.signature.value).toBe('note-signature');
  });
  test('of the locked copy is wrong', async () => {
    expect(wrong(await run({ locked: async () => await sign(21, new Uint8Array(32)) }))).toEqual([
      'locked wrong',
    ]);
  });
  test('of a proof is wrong', async () => {
    const checks = await run({
      inclusion: async (sequences) => sequences.map((sequence) => ({ sequence, path: ['00'.repeat(32)] })),
    });
    expect(wrong(checks)).toEqual(['inclusion wrong']);
  });
});

test('a tree that was made anew does not follow the head that the reader holds', async () => {
  const held = await sign(9, naiveRoot(LEAVES.slice(1, 10)));
  const checks = await run({}, thread(), held);
  expect(wrong(checks)).toEqual(['consistency wrong']);
  expect(wrong(await run({}, thread(), await sign(15)))).toEqual([]);
  expect(wrong(await run({}, thread(), await sign(23)))).toEqual([]);
});

test('a head of another log or another key is no head to hold', async () => {
  expect((await run({}, thread(), await sign(9, undefined, 'other.example/custody'))).consistency.state).toBe(
    'wrong',
  );
  pair = (await crypto.subtle.generateKey('Ed25519', true, ['sign', 'verify'])) as CryptoKeyPair;
  const stranger = await sign(9);
  const { publicKey } = pair;
  expect(publicKey).toBeDefined();
  const checks = await run({ keys: async () => [key] }, thread(), stranger);
  expect(checks.signature.value).toBe('note-unsigned');
  key = await verifierKey(ORIGIN, new Uint8Array(await crypto.subtle.exportKey('raw', publicKey)));
});

test('entries newer than the head wait for the next one', async () => {
  const entries = [22, 4].map((sequence) => ({
    sequence,
    canonical: LOG[sequence] as string,
    leafHash: hex(LEAVES[sequence] as Uint8Array),
  }));
  const checks = await run({}, { ...thread(), entries });
  expect(checks.inclusion).toMatchObject({ state: 'right', value: '1 of 2' });
  expect(checks.inclusion.detail).toContain('1 newer than the head');
});

test('what cannot be fetched is not checked: neither right nor wrong', async () => {
  const away = () => Promise.reject(new Error('no line'));
  const checks = await run({ heads: away, original: away, locked: async () => null });
  expect(wrong(checks)).toEqual([
    'signature unchecked',
    'inclusion unchecked',
    'consistency unchecked',
    'locked unchecked',
    'original unchecked',
  ]);
  expect(wrong(await run({ original: null }))).toEqual(['original unchecked']);
});

test('a browser without Ed25519 says so plainly', async () => {
  const { subtle } = globalThis.crypto;
  const importKey = subtle.importKey.bind(subtle);
  subtle.importKey = (() => Promise.reject(new DOMException('no', 'NotSupportedError'))) as never;
  try {
    const checks = await run();
    expect(checks.signature).toMatchObject({ state: 'unchecked', value: 'not in this browser' });
    expect(checks.leaves.state).toBe('right');
  } finally {
    subtle.importKey = importKey;
  }
});

test('two heads are compared whichever is named first', async () => {
  const heads: [string, string] = [await sign(21), await sign(9)];
  const path = async (from: number, to: number) => naiveConsistency(from, LEAVES.slice(0, to)).map(hex);
  const found = { from: 9, to: 21 };
  expect(await compareHeads(heads, ORIGIN, [key], path)).toMatchObject(found);
  expect(await compareHeads([heads[1], heads[0]], ORIGIN, [key], path)).toMatchObject(found);
  await expect(
    compareHeads([heads[0], await sign(9, new Uint8Array(32))], ORIGIN, [key], path),
  ).rejects.toMatchObject({ code: 'proof-root' });
});

import { mkdtemp, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest';
import { headKeys } from '@/lib/custody/heads/headKeys';
import { headOf } from '@/lib/custody/heads/makeHead';
import { HEADS_PREFIX } from '@/lib/custody/heads/storeHead';
import { headText } from '@/lib/custody/pure/head';
import { signatureLine, verifierKey } from '@/lib/custody/pure/note';
import { bringTreeUp } from '@/lib/custody/tree/grow';
import { rootAt } from '@/lib/custody/tree/prove';
import { headSigner, tendHeads } from '@/lib/http/treeHeads';
import {
  type AuditedHouse,
  audit,
  type Copy,
  copyOf,
  openAuditedHouse,
  rewrite,
  textAt,
} from '@/tests/support/auditedHouse';
import { addPerson } from '@/tests/support/people';

let audited: AuditedHouse;
let copy: Copy;
let folder: string;
let size: number;
beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'bellkeep-letters-'));
  audited = await openAuditedHouse(2);
  size = audited.sizes[0] ?? 0;
});
afterAll(async () => {
  await audited.close();
  await rm(folder, { recursive: true });
});
beforeEach(async () => {
  copy = await copyOf(audited);
});
afterEach(() => copy.close());

const ORIGIN = () => audited.house.services.env.BELLKEEP_CUSTODY_ORIGIN;
const signedBy = async (
  signer: { publicKey: Uint8Array; sign(message: Uint8Array): Promise<Uint8Array> },
  root: Uint8Array,
) => {
  const text = headText(ORIGIN(), size, root);
  return `${text}\n${await signatureLine(ORIGIN(), signer.publicKey, await signer.sign(Buffer.from(text)))}`;
};
const inFile = async (text: string) => {
  const file = join(folder, `${Math.random()}.txt`);
  await writeFile(file, text);
  return file;
};

test('a head that was replaced by one over another tree, well signed, is named', async () => {
  await rewrite(copy, 3, (await textAt(copy, 3)).replace('"label":"', '"label":"x'), true);
  await copy.sql('delete from custody_node');
  await bringTreeUp(copy.services);
  const root = await rootAt(copy.services.read, size);
  const note = await signedBy(await headSigner(copy.services), root);
  await copy.sql('update custody_head set root = ?, note = ? where size = ?', [root, note, size]);
  const { findings, codes } = await copy.audit({ withBytes: false });
  expect(findings).toContainEqual(expect.objectContaining({ code: 'head-replaced', size }));
  expect(codes).toContain('tree-replaced');
  expect(codes).not.toContain('head-unsigned');
});

test('a head that is signed by another key is named', async () => {
  const pair = (await crypto.subtle.generateKey('Ed25519', true, ['sign', 'verify'])) as CryptoKeyPair;
  const signer = {
    publicKey: new Uint8Array(await crypto.subtle.exportKey('raw', pair.publicKey)),
    sign: async (message: Uint8Array) =>
      new Uint8Array(
        await crypto.subtle.sign('Ed25519', pair.privateKey, message as Uint8Array<ArrayBuffer>),
      ),
  };
  const note = await signedBy(signer, await rootAt(copy.services.read, size));
  await copy.sql('update custody_head set note = ? where size = ?', [note, size]);
  const { findings } = await copy.audit({ withBytes: false });
  expect(findings).toContainEqual(expect.objectContaining({ code: 'head-unsigned', size }));
  expect(findings).toContainEqual(expect.objectContaining({ code: 'head-replaced', size }));
  // Who trusts another key than the one that signs is told so for each head.
  const strange = await verifierKey(ORIGIN(), signer.publicKey);
  const elsewhere = await audit(audited.house.services, { keys: [strange], withBytes: false });
  expect(elsewhere.counts['head-unsigned']).toBe(4);
  const [own] = await headKeys(audited.house.services);
  expect((await audit(audited.house.services, { keys: [own?.verifier ?? ''], withBytes: false })).ok).toBe(
    true,
  );
});

test('a head whose text was spoilt is named', async () => {
  await copy.sql(`update custody_head set note = 'no head' where size = ?`, [size]);
  expect((await copy.audit({ withBytes: false })).codes).toContain('head-unreadable');
});

test('a head that was taken out of the database is named', async () => {
  await copy.sql('delete from custody_head where size = ?', [size]);
  const { codes, findings } = await copy.audit({ withBytes: false });
  expect(codes).toEqual(['head-removed']);
  expect(findings[0]?.size).toBe(size);
});

test('a head that never reached storage is named after an hour', async () => {
  const key = audited.house.fake.backdoor.keys('bellkeep').find((one) => one.startsWith(HEADS_PREFIX)) ?? '';
  const kept = await headOf(audited.house.services, size);
  expect(key).toContain(String(size));
  await copy.sql('update custody_head set made_at = made_at - 7200000');
  await audited.house.fake.backdoor.remove('bellkeep', key);
  const { codes } = await copy.audit({ withBytes: false });
  expect(codes).toEqual(['head-not-stored']);
  await audited.house.services.storage.put({
    key,
    body: Buffer.from(kept?.note ?? ''),
    contentType: 'text/plain',
    retainUntilMs: audited.house.clock.now() + 9e10,
  });
  expect((await copy.audit({ withBytes: false })).ok).toBe(true);
});

test('a letter to the auditors vouches for the log, and names a tree that was made anew', async () => {
  const { house } = audited;
  await addPerson(house, { roles: ['auditor'] });
  house.clock.advance(48 * 3_600_000);
  await tendHeads(house.services);
  await house.deliver();
  const letter = house.mail.at(-1)?.text ?? '';
  const good = await audit(house.services, { headFiles: [await inFile(letter)], withBytes: false });
  expect(good.ok).toBe(true);
  expect(good.heads.mail).toBeGreaterThan(0);
  // As a mail program saves it.
  const quoted = `Content-Transfer-Encoding: quoted-printable\r\n\r\n${letter
    .replaceAll('=', '=3D')
    .replaceAll('—', '=E2=80=94')
    .replace(/(.{60})/g, '$1=\r\n')}`;
  const saved = await audit(house.services, { headFiles: [await inFile(quoted)], withBytes: false });
  expect(saved.ok).toBe(true);
  expect(saved.heads.mail).toBe(good.heads.mail);

  const later = await copyOf(audited);
  await rewrite(later, 3, (await textAt(later, 3)).replace('"label":"', '"label":"x'), true);
  await later.sql('delete from custody_node');
  await bringTreeUp(later.services);
  const mail = { headFiles: [await inFile(letter)], withBytes: false };
  const alone = {
    ...later.services,
    storage: { ...later.services.storage, list: async () => ({ entries: [], next: undefined }) },
  };
  expect((await audit(alone, mail)).codes).toContain('tree-replaced');
  await later.close();
  await expect(audit(house.services, { headFiles: [await inFile('nothing here')] })).rejects.toThrow(
    'holds no head',
  );
});

// Last, because what is unlocked stays unlocked.
test('a head in storage that was unlocked, and one that was altered behind the store’s back, are named', async () => {
  const { fake, services } = audited.house;
  const keys = fake.backdoor.keys('bellkeep').filter((one) => one.startsWith(HEADS_PREFIX));
  await fake.backdoor.unlock('bellkeep', keys[0] ?? '');
  expect((await audit(services, { withBytes: false })).findings).toContainEqual(
    expect.objectContaining({ code: 'head-unlocked', key: keys[0] }),
  );
  const note = await signedBy(await headSigner(services), new Uint8Array(32));
  await fake.backdoor.replaceBytes('bellkeep', keys[0] ?? '', Buffer.from(note));
  const { findings } = await audit(services, { withBytes: false });
  expect(findings).toContainEqual(expect.objectContaining({ code: 'head-replaced', size }));
});

import { mkdtemp, readdir, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { buffer } from 'node:stream/consumers';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { evidenceRequest, recording } from '@/db/schema';
import { sendRecording } from '@/devices/agent/upload';
import { askEvidence } from '@/lib/custody/evidence/askEvidence';
import { takeEvidence } from '@/lib/custody/evidence/takeEvidence';
import { verifierLines } from '@/lib/custody/heads/headKeys';
import { readThread } from '@/lib/custody/readThread';
import { headSigner, tendHeads } from '@/lib/http/treeHeads';
import { listAnew, run, shellOf, spoiltCopy, turnBit, unpack } from '@/tests/support/packages';
import { chestWav, clipOf, openPassageHouse, type PassageHouse } from '@/tests/support/passageHouse';
import { addPerson, authorityOf } from '@/tests/support/people';

let house: PassageHouse;
let place: string;
let archive: Buffer;
let folder: string;
let number: string;
let key: string;
let manifestSha256: string;
let original: Uint8Array;

beforeAll(async () => {
  place = await mkdtemp(join(tmpdir(), 'bellkeep-package-'));
  house = await openPassageHouse();
  const { agent } = await house.enrolled();
  original = chestWav();
  const { answer } = await sendRecording(agent, clipOf(original));
  number = answer.recording;
  await tendHeads(house.services);
  await sendRecording(agent, clipOf(chestWav(undefined, 2)));
  const auditor = authorityOf<'evidence.make'>(
    await addPerson(house, { name: 'Marguerite <b>Osei</b> “Č”', roles: ['auditor'] }),
  );
  const asked = await askEvidence(
    house.services,
    auditor,
    number,
    { reason: 'Asked by the coroner; “file” & <case> 7' },
    async () => undefined,
  );
  const taken = await takeEvidence(house.services, await headSigner(house.services), auditor, asked.id);
  archive = await buffer(taken.body);
  manifestSha256 = taken.manifestSha256;
  await writeFile(join(place, taken.filename), archive);
  await unpack(archive, place);
  folder = join(place, taken.filename.replace('.zip', ''));
  [key = ''] = await verifierLines(house.services);
});
afterAll(async () => {
  await house.close();
  await rm(place, { recursive: true });
});

const filesIn = async (where: string) =>
  (await readdir(where, { recursive: true, withFileTypes: true }))
    .filter((entry) => entry.isFile())
    .map((entry) => join(entry.parentPath, entry.name).slice(where.length + 1))
    .sort();
const verify = (target: string, ...more: string[]) =>
  run(process.execPath, [join(folder, 'verify.mjs'), target, ...more], place);
const steps = async (where: string) =>
  run('sh', ['-e', '-c', shellOf(await readFile(join(where, 'VERIFY.md'), 'utf8'))], where);
const independent = (where: string, ...more: string[]) =>
  run('python3', [resolve('tests/support/verifyPackage.py'), where, ...more], where);

test('a package holds the original byte for byte, and every file that its layout names', async () => {
  const files = await filesIn(folder);
  expect(Buffer.from(original).equals(await readFile(join(folder, `original/${number}.wav`)))).toBe(true);
  const shape = new Set(
    files.map((file) => file.replace(/[0-9a-f]+\.pem$/, 'ID.pem').replace(/\d+(?=[-.])/g, 'N')),
  );
  for (const one of [
    'SHA256SUMS',
    'VERIFY.md',
    'consistency/N-N.json',
    'derived/peaks.bin',
    'derived/spectrogram.bin',
    'device.json',
    'entries.jsonl',
    'heads/N.txt',
    'keys/device-token.jwks.json',
    'keys/tree-head-ID.pem',
    'keys/tree-head.txt',
    'manifest.json',
    'proofs/N.json',
    'report.html',
    'report.pdf',
    'verify.mjs',
  ])
    expect(shape).toContain(one);
});

test('its steps run as they are printed, with openssl and sha256sum alone', async () => {
  const { code, output } = await steps(folder);
  expect(output).toContain('in the tree');
  expect(output).toContain('Signature Verified Successfully');
  expect(code, output).toBe(0);
});

test('its own verifier accepts the folder and the archive, on bare Node, with and without the key', async () => {
  for (const target of [folder, `${folder}.zip`]) {
    const { code, output } = await verify(target, '--key', key);
    expect(code, output).toBe(0);
    expect(output).toContain('Everything holds.');
  }
  expect((await verify(folder)).output).toContain('Compare it with one you were given otherwise');
  const strange = `${key.slice(0, key.lastIndexOf('+') + 1)}AAAA`;
  expect((await verify(folder, '--key', strange)).code).toBe(1);
  expect((await verify(join(place, 'nothing'))).code).toBe(1);
});

test('a verifier written from the layout alone, in another language, accepts it', async () => {
  const { code, output } = await independent(folder, key);
  expect(output).toContain('everything holds');
  expect(code, output).toBe(0);
});

describe('one bit turned', () => {
  test('anywhere in any file is found by the verifier', async () => {
    for (const file of await filesIn(folder)) {
      if (file === 'verify.mjs') continue;
      for (const at of [0, 0.5, 0.999]) {
        const copy = await spoiltCopy(folder);
        await turnBit(join(copy.folder, file), at);
        const { code, output } = await verify(copy.folder);
        expect(code, `${file} at ${at}: ${output}`).toBe(1);
        await copy.remove();
      }
    }
  }, 300_000);

  test('in the verifier itself is found by the sums', async () => {
    const copy = await spoiltCopy(folder);
    await turnBit(join(copy.folder, 'verify.mjs'), 0.01);
    expect((await steps(copy.folder)).code).not.toBe(0);
    expect((await independent(copy.folder)).code).toBe(1);
    await copy.remove();
  });

  test('in what proves is found though the lists were made anew, by all three ways', async () => {
    const files = (await filesIn(folder)).filter((file) =>
      /^(original|entries|proofs|heads|consistency|keys\/tree-head)/.test(file),
    );
    expect(files.length).toBeGreaterThan(10);
    for (const file of files) {
      const copy = await spoiltCopy(folder);
      await turnBit(join(copy.folder, file), 0.45);
      await listAnew(copy.folder);
      const own = await verify(copy.folder, '--key', key);
      expect(own.code, `${file}: ${own.output}`).toBe(1);
      const other = await independent(copy.folder, key);
      expect(other.code, `${file}: ${other.output}`).toBe(1);
      // A proof of consistency is no essential: the steps by hand leave it to the verifiers.
      if (!file.startsWith('consistency')) {
        const hand = await steps(copy.folder);
        expect(hand.code, `${file}: ${hand.output}`).not.toBe(0);
      }
      await copy.remove();
    }
  }, 300_000);

  test('in a picture or the device’s record is found though the lists were made anew', async () => {
    const files = ['derived/peaks.bin', 'derived/spectrogram.bin'];
    for (const file of files) {
      const copy = await spoiltCopy(folder);
      await turnBit(join(copy.folder, file), 0.5);
      await listAnew(copy.folder);
      expect((await verify(copy.folder)).code, file).toBe(1);
      await copy.remove();
    }
    for (const member of ['serialNumber', 'thumbprint']) {
      const copy = await spoiltCopy(folder);
      const path = join(copy.folder, 'device.json');
      const device = JSON.parse(await readFile(path, 'utf8')) as Record<string, unknown>;
      await writeFile(path, JSON.stringify({ ...device, [member]: 'another' }));
      await listAnew(copy.folder);
      expect((await verify(copy.folder)).code, member).toBe(1);
      await copy.remove();
    }
  });
});

test('an entry left out, a file put in, an archive cut short are found', async () => {
  const copy = await spoiltCopy(folder);
  const path = join(copy.folder, 'entries.jsonl');
  const lines = (await readFile(path, 'utf8')).split('\n');
  await writeFile(path, [...lines.slice(0, 2), ...lines.slice(3)].join('\n'));
  await listAnew(copy.folder);
  expect((await verify(copy.folder)).code).toBe(1);
  await copy.remove();
  const more = await spoiltCopy(folder);
  await writeFile(join(more.folder, 'note.txt'), 'hello');
  expect((await verify(more.folder)).output).toContain('note.txt does not belong here');
  await more.remove();
  const cut = join(place, 'cut.zip');
  await writeFile(cut, archive.subarray(0, archive.length - 40));
  expect((await verify(cut)).code).toBe(1);
});

test('that it was made is an entry, with the reason and the hash of its manifest', async () => {
  const [row] = await house.services.read.select({ id: recording.id }).from(recording);
  const { rows } = await readThread(house.services, { kind: 'recording', id: row?.id ?? '' });
  const exported = rows.find(({ kind }) => kind === 'exported');
  expect(exported?.entry.detail).toMatchObject({ number, manifestSha256 });
  expect(rows.map(({ kind }) => kind)).toContain('evidence-asked');
  expect(await house.services.read.select().from(evidenceRequest)).toMatchObject([
    { decision: 'not-needed' },
  ]);
});

test('what people wrote is text in the report, whole in HTML, and the PDF is one', async () => {
  const html = await readFile(join(folder, 'report.html'), 'utf8');
  expect(html).not.toContain('<b>Osei');
  expect(html).toContain('&#60;b&#62;Osei');
  expect(html).toContain('“Č”');
  const pdf = await readFile(join(folder, 'report.pdf'));
  expect(pdf.subarray(0, 5).toString()).toBe('%PDF-');
  expect(pdf.subarray(-6).toString().trim()).toBe('%%EOF');
});

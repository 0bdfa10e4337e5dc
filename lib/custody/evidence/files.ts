import { createHash, createPublicKey } from 'node:crypto';
import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import type { Services } from '@/lib/platform/services';
import { parseVerifier } from '../pure/note';
import type { Evidence, Making } from './gather';
import { htmlReport } from './htmlReport';
import { pdfReport } from './pdfReport';
import { verifySteps } from './verifySteps';

export interface PackageFile {
  /** Inside the package's folder. */
  path: string;
  body: Buffer;
}

export interface PackageFiles {
  /** Name of the folder all files are in, and of the archive. */
  folder: string;
  /** Everything but the original, which is streamed. */
  files: PackageFile[];
  originalPath: string;
  /** SHA-256 of manifest.json, hex: it stands in the entry that the package was made. */
  manifestSha256: string;
}

const EXTENSIONS: Record<string, string> = {
  'audio/wav': 'wav',
  'audio/wave': 'wav',
  'audio/x-wav': 'wav',
  'audio/vnd.wave': 'wav',
  'audio/flac': 'flac',
  'audio/x-flac': 'flac',
  'audio/ogg': 'ogg',
  'audio/mpeg': 'mp3',
};

const LARGEST_PICTURE_BYTES = 64 * 1024 * 1024;
const sha256 = (bytes: Uint8Array): string => createHash('sha256').update(bytes).digest('hex');
const json = (value: unknown): Buffer => Buffer.from(`${JSON.stringify(value, null, 2)}\n`, 'utf8');
const text = (value: string): Buffer => Buffer.from(value, 'utf8');

/** SubjectPublicKeyInfo of an Ed25519 key as PEM (RFC 8410), for openssl. */
const pemOf = (publicKey: Uint8Array): string =>
  createPublicKey({
    key: { kty: 'OKP', crv: 'Ed25519', x: Buffer.from(publicKey).toString('base64url') },
    format: 'jwk',
  })
    .export({ type: 'spki', format: 'pem' })
    .toString();

/** The files that prove, and that checks go by. */
async function provingFiles(services: Pick<Services, 'storage'>, evidence: Evidence): Promise<PackageFile[]> {
  const keys = await Promise.all(
    evidence.treeKeys.map(async ({ verifier }) => ({ verifier, ...(await parseVerifier(verifier)) })),
  );
  const derived = await Promise.all(
    evidence.derived.map(async ({ kind, key }) => ({
      path: `derived/${kind}.bin`,
      body: Buffer.from(await services.storage.getBytes(key, LARGEST_PICTURE_BYTES)),
    })),
  );
  return [
    ...derived,
    { path: 'entries.jsonl', body: text(evidence.entries.map(({ canonical }) => `${canonical}\n`).join('')) },
    ...evidence.proofs.map((proof) => ({ path: `proofs/${proof.sequence}.json`, body: json(proof) })),
    ...evidence.heads.map(({ size, note }) => ({ path: `heads/${size}.txt`, body: text(note) })),
    ...evidence.consistency.map((proof) => ({
      path: `consistency/${proof.from}-${proof.to}.json`,
      body: json(proof),
    })),
    { path: 'keys/tree-head.txt', body: text(keys.map(({ verifier }) => `${verifier}\n`).join('')) },
    ...keys.map(({ keyId, publicKey }) => ({
      path: `keys/tree-head-${keyId}.pem`,
      body: text(pemOf(publicKey)),
    })),
    { path: 'keys/device-token.jwks.json', body: json({ keys: evidence.tokenKeys }) },
    { path: 'device.json', body: json(evidence.device) },
  ];
}

/**
 * The files of a package, by the layout that VERIFY.md and DEVELOPERS.md describe: an independent verifier can be
 * written from it. A change of it is a new number in `format`.
 */
export async function packageFiles(
  services: Pick<Services, 'storage'>,
  evidence: Evidence,
  making: Making,
): Promise<PackageFiles> {
  const originalPath = `original/${evidence.number}.${EXTENSIONS[evidence.original.mediaType] ?? 'bin'}`;
  const proven = await provingFiles(services, evidence);
  const read: PackageFile[] = [
    { path: 'report.html', body: text(htmlReport(evidence, making)) },
    { path: 'report.pdf', body: await pdfReport(evidence, making) },
    { path: 'VERIFY.md', body: text(verifySteps(evidence, originalPath)) },
    {
      path: 'verify.mjs',
      body: await readFile(
        join(/* turbopackIgnore: true */ process.cwd(), 'lib', 'custody', 'evidence', 'verify.mjs'),
      ),
    },
  ];
  const files = [...proven, ...read];
  const listed = [
    { path: originalPath, sha256: evidence.original.sha256, bytes: evidence.original.bytes },
    ...files.map(({ path, body }) => ({ path, sha256: sha256(body), bytes: body.length })),
  ].sort((a, b) => (a.path < b.path ? -1 : 1));
  const manifest = json({
    format: 'bellkeep-evidence/1',
    recording: evidence.number,
    ...making,
    origin: evidence.origin,
    treeSize: evidence.heads.at(-1)?.size ?? 0,
    original: {
      path: originalPath,
      mediaType: evidence.original.mediaType,
      sealedSequence: evidence.original.sealedSequence,
    },
    derived: evidence.derived.map(({ kind }) => ({ kind, path: `derived/${kind}.bin` })),
    files: listed,
  });
  const manifestSha256 = sha256(manifest);
  const sums = [...listed, { path: 'manifest.json', sha256: manifestSha256 }];
  return {
    folder: `evidence-${evidence.number}`,
    files: [
      ...files,
      { path: 'manifest.json', body: manifest },
      { path: 'SHA256SUMS', body: text(sums.map((file) => `${file.sha256}  ${file.path}\n`).join('')) },
    ],
    originalPath,
    manifestSha256,
  };
}

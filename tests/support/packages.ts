import { execFile } from 'node:child_process';
import { createHash } from 'node:crypto';
import { createWriteStream } from 'node:fs';
import { cp, mkdir, mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { pipeline } from 'node:stream/promises';
import yauzl from 'yauzl';

/** Unpack an archive into a folder. @returns the paths inside */
export async function unpack(archive: Buffer, folder: string): Promise<string[]> {
  const zip = await new Promise<yauzl.ZipFile>((resolve, reject) =>
    yauzl.fromBuffer(archive, { lazyEntries: true }, (error, file) =>
      error ? reject(error) : resolve(file),
    ),
  );
  const paths: string[] = [];
  await new Promise<void>((resolve, reject) => {
    zip.on('end', resolve);
    zip.on('error', reject);
    zip.on('entry', (entry: yauzl.Entry) => {
      paths.push(entry.fileName);
      const path = join(folder, entry.fileName);
      zip.openReadStream(entry, async (error, stream) => {
        if (error) return reject(error);
        await mkdir(dirname(path), { recursive: true });
        await pipeline(stream, createWriteStream(path));
        zip.readEntry();
      });
    });
    zip.readEntry();
  });
  return paths;
}

export interface Ran {
  code: number;
  output: string;
}

/** Run a program to its end. */
export const run = (command: string, args: string[], cwd: string): Promise<Ran> =>
  new Promise((resolve) => {
    // Nothing of the house: a package is checked anywhere.
    const env = { NODE_ENV: process.env.NODE_ENV, PATH: process.env.PATH ?? '', HOME: cwd };
    const child = execFile(command, args, { cwd, env }, (_, stdout, stderr) =>
      resolve({ code: child.exitCode ?? -1, output: `${stdout}${stderr}` }),
    );
  });

/** A copy of a package to spoil. */
export async function spoiltCopy(folder: string): Promise<{ folder: string; remove(): Promise<void> }> {
  const copy = await mkdtemp(join(tmpdir(), 'bellkeep-spoilt-'));
  await cp(folder, copy, { recursive: true });
  return { folder: copy, remove: () => rm(copy, { recursive: true }) };
}

/** Turn one bit of a file. @param at where, as a fraction of its length */
export async function turnBit(path: string, at: number): Promise<void> {
  const bytes = await readFile(path);
  const index = Math.min(bytes.length - 1, Math.floor(bytes.length * at));
  bytes[index] = (bytes[index] ?? 0) ^ 1;
  await writeFile(path, bytes);
}

const sha256 = (bytes: Uint8Array) => createHash('sha256').update(bytes).digest('hex');

/** What somebody does who knows the layout: list the changed files as if nothing had happened. */
export async function listAnew(folder: string): Promise<void> {
  const path = join(folder, 'manifest.json');
  const manifest = JSON.parse(await readFile(path, 'utf8')) as {
    files: { path: string; sha256: string; bytes: number }[];
  };
  for (const file of manifest.files) {
    const body = await readFile(join(folder, file.path));
    file.sha256 = sha256(body);
    file.bytes = body.length;
  }
  const text = Buffer.from(`${JSON.stringify(manifest, null, 2)}\n`);
  await writeFile(path, text);
  const lines = [...manifest.files, { path: 'manifest.json', sha256: sha256(text) }];
  await writeFile(join(folder, 'SHA256SUMS'), lines.map((file) => `${file.sha256}  ${file.path}\n`).join(''));
}

/** The shell blocks of a document, in order, as one script that ends at the first error. */
export const shellOf = (document: string): string =>
  [...document.matchAll(/```sh\n([\s\S]*?)```/g)].map((match) => match[1]).join('\n');

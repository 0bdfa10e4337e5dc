import { mkdir, readdir, readFile } from 'node:fs/promises';
import { join } from 'node:path';
import type { ChecksumName, Checksums } from './checksums';
import { readJsonFiles, removeWhole, syncDirectory, writeWhole } from './disk';
import type { Locked } from './locks';

export interface UploadPart {
  number: number;
  blob: string;
  sizeBytes: number;
  /** MD5 of the part in hexadecimal, without quotes. */
  etag: string;
  modifiedMs: number;
  checksums: Checksums;
}

/** What a multipart upload was begun with. */
export interface UploadRecord extends Locked {
  id: string;
  key: string;
  initiatedMs: number;
  system: Record<string, string>;
  meta: Record<string, string>;
  tags: Record<string, string>;
  checksumAlgorithm?: ChecksumName | undefined;
  checksumType?: 'FULL_OBJECT' | 'COMPOSITE' | undefined;
}

export interface Upload {
  record: UploadRecord;
  parts: Map<number, UploadPart>;
  directory: string;
}

const UPLOAD_FILE = 'upload';

/** Begin an upload: it exists once its record is durable. */
export async function createUpload(uploadsDirectory: string, record: UploadRecord): Promise<Upload> {
  const directory = join(uploadsDirectory, record.id);
  await mkdir(directory);
  await syncDirectory(uploadsDirectory);
  await writeWhole(join(directory, UPLOAD_FILE), JSON.stringify(record));
  return { record, parts: new Map(), directory };
}

/** @returns the part that this one replaces, whose blob may now be removed */
export async function savePart(upload: Upload, part: UploadPart): Promise<UploadPart | undefined> {
  await writeWhole(join(upload.directory, `${part.number}.json`), JSON.stringify(part));
  const before = upload.parts.get(part.number);
  upload.parts.set(part.number, part);
  return before;
}

export const removeUpload = (upload: Upload): Promise<void> => removeWhole(upload.directory);

/** Uploads left over from before a restart; a directory without a record was never begun. */
export async function loadUploads(uploadsDirectory: string): Promise<Map<string, Upload>> {
  const uploads = new Map<string, Upload>();
  for (const id of await readdir(uploadsDirectory)) {
    const directory = join(uploadsDirectory, id);
    const text = await readFile(join(directory, UPLOAD_FILE), 'utf8').catch(() => undefined);
    if (text === undefined) {
      await removeWhole(directory);
      continue;
    }
    const parts = await readJsonFiles<UploadPart>(directory);
    uploads.set(id, {
      record: JSON.parse(text) as UploadRecord,
      parts: new Map(parts.map((part) => [part.number, part])),
      directory,
    });
  }
  return uploads;
}

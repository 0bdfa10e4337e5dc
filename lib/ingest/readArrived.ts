import { createHash } from 'node:crypto';
import type { Storage } from '@/lib/storage/port';
import type { AnalysisPool } from './analysisPool';
import type { AnalysisRequest, AnalysisResult } from './messages';

export interface Arrived {
  sha256: string;
  bytes: number;
  etag: string;
  /** null when no thread could make sense of it. */
  analysis: AnalysisResult | null;
}

/**
 * Read an object once: length and SHA-256 here, sound in a thread. The hash is taken in this thread so that it does
 * not depend on a decoder surviving what it is given.
 */
export async function readArrived(
  storage: Storage,
  pool: AnalysisPool,
  key: string,
  request: AnalysisRequest,
): Promise<Arrived> {
  const object = await storage.getStream(key);
  const hash = createHash('sha256');
  let bytes = 0;
  async function* hashed(): AsyncGenerator<Uint8Array> {
    for await (const chunk of object.body) {
      hash.update(chunk);
      bytes += chunk.byteLength;
      yield chunk;
    }
  }
  const analysis = await pool.analyse(hashed(), request);
  return { sha256: hash.digest('hex'), bytes, etag: object.etag, analysis };
}

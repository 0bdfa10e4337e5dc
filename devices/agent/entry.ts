import { createHash } from 'node:crypto';
import { z } from 'zod';
import { CompleteAnswer } from '@/lib/contract/device';
import { type Clip, ClipFacts } from './clip';

const Head = z.object({
  version: z.literal(1),
  facts: ClipFacts,
  sha256: z.string(),
  bytes: z.number().int(),
});
type Head = z.infer<typeof Head>;

/**
 * How far a waiting clip got. `queued` has no journal at all: the clip's own file says it. `refused` is the service's
 * last word on the clip, `damaged` the disk's; both keep the bytes until a person decides.
 */
export const Journal = z.discriminatedUnion('state', [
  z.object({ state: z.literal('slotted'), recording: z.string() }),
  z.object({ state: z.literal('put'), recording: z.string() }),
  z.object({
    state: z.literal('completed'),
    recordingNumber: z.string(),
    sha256: z.string(),
    answer: CompleteAnswer,
  }),
  z.object({ state: z.literal('refused'), code: z.string(), title: z.string() }),
  z.object({ state: z.literal('damaged'), why: z.string() }),
]);
export type Journal = z.infer<typeof Journal>;

const NEWLINE = 10;
/** Facts are a few hundred characters; the longest the contract admits are within this. */
export const HEAD_LIMIT_BYTES = 4096;

export const sha256Hex = (bytes: Uint8Array | string): string =>
  createHash('sha256').update(bytes).digest('hex');

/**
 * One file a clip: a line of JSON, then the bytes. One file, so that one rename makes the whole clip appear.
 * @throws ZodError when the contract would not take what is said of the clip
 */
export function packClip(clip: Clip): { file: Uint8Array; sha256: string; recordingNumber: string } {
  const { bytes, ...said } = clip;
  const facts = ClipFacts.parse(said);
  const sha256 = sha256Hex(bytes);
  const head: Head = { version: 1, facts, sha256, bytes: bytes.length };
  const line = new TextEncoder().encode(`${JSON.stringify(head)}\n`);
  if (line.length > HEAD_LIMIT_BYTES) throw new RangeError('the facts of a clip are too long');
  const file = new Uint8Array(line.length + bytes.length);
  file.set(line);
  file.set(bytes, line.length);
  return { file, sha256, recordingNumber: facts.recordingNumber };
}

/** The first line of a clip's file. @returns null when it is not one */
export function readHead(start: Uint8Array): (Head & { length: number }) | null {
  const end = start.indexOf(NEWLINE);
  if (end < 0) return null;
  try {
    const head = Head.parse(JSON.parse(new TextDecoder().decode(start.subarray(0, end))));
    return { ...head, length: end + 1 };
  } catch {
    return null;
  }
}

/** The clip of a file. @returns null when the bytes are no longer those that were recorded */
export function unpackClip(file: Uint8Array): Clip | null {
  const head = readHead(file);
  if (!head) return null;
  const bytes = file.subarray(head.length);
  if (bytes.length !== head.bytes || sha256Hex(bytes) !== head.sha256) return null;
  return { ...head.facts, bytes };
}

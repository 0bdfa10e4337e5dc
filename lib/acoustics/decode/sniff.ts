import type { Container, Encoding } from '../types';
import type { Sniffed } from './types';

/** Bytes by which a file is known. */
export const SNIFFED_BYTES = 64;

const ascii = (bytes: Uint8Array, from: number, length: number): string => {
  let text = '';
  for (let i = from; i < Math.min(from + length, bytes.length); i++)
    text += String.fromCharCode(bytes[i] ?? 0);
  return text;
};

/** Length of an ID3v2 tag at the start of a file, header included; 0 without one (ID3v2.4.0 structure, 3.1). */
export function id3Length(head: Uint8Array): number {
  if (ascii(head, 0, 3) !== 'ID3' || head.length < 10) return 0;
  const size = [6, 7, 8, 9].reduce((sum, i) => (sum << 7) | ((head[i] ?? 0) & 0x7f), 0);
  return 10 + size + ((head[5] ?? 0) & 0x10 ? 10 : 0);
}

/** Whether these are the first bytes of an MPEG audio layer III frame (ISO/IEC 11172-3, 2.4.1.3, from memory). */
const isLayer3 = (head: Uint8Array): boolean =>
  head.length >= 4 &&
  head[0] === 0xff &&
  ((head[1] ?? 0) & 0xe6) === 0xe2 &&
  ((head[1] ?? 0) & 0x18) !== 0x08 &&
  ((head[2] ?? 0) & 0xf0) !== 0xf0 &&
  ((head[2] ?? 0) & 0x0c) !== 0x0c;

/** First bytes that settle it, each at the start of the file (from memory, as registered by their formats). */
const SIGNATURES: readonly [string, Sniffed][] = [
  ['RF64', 'rf64'],
  ['BW64', 'bw64'],
  ['fLaC', 'flac'],
  ['OggS', 'ogg'],
  ['ID3', 'mp3'],
  ['FORM', 'aiff'],
  ['caff', 'sound-other'],
  ['.snd', 'sound-other'],
  ['#!AMR', 'sound-other'],
  ['MThd', 'sound-other'],
  ['wvpk', 'sound-other'],
  ['\u0030\u0026\u00b2\u0075', 'sound-other'],
  ['\u001a\u0045\u00df\u00a3', 'matroska'],
  ['\u0089PNG', 'image'],
  ['\u00ff\u00d8\u00ff', 'image'],
  ['GIF8', 'image'],
  ['PK', 'archive'],
  ['\u001f\u008b', 'archive'],
  ['7z\u00bc\u00af', 'archive'],
  ['BZh', 'archive'],
  ['\u00fd7zXZ', 'archive'],
  ['\u0028\u00b5\u002f\u00fd', 'archive'],
  ['%PDF', 'document'],
];

/** What a file is by its first bytes (SNIFFED_BYTES are enough), whatever its name or media type says. */
export function sniffContainer(head: Uint8Array): Sniffed {
  if (head.length === 0) return 'nothing';
  const text = ascii(head, 0, SNIFFED_BYTES);
  if (text.startsWith('RIFF') || text.startsWith('RIFX'))
    return text.slice(8, 12) === 'WAVE' || head.length < 12 ? 'wav' : 'riff-other';
  for (const [signature, kind] of SIGNATURES) if (text.startsWith(signature)) return kind;
  if (text.slice(4, 8) === 'ftyp') return 'mp4';
  if (isLayer3(head)) return 'mp3';
  if (head[0] === 0xff && ((head[1] ?? 0) & 0xf6) === 0xf0) return 'aac';
  if (/^(\u00ef\u00bb\u00bf)?\s*<(!doctype|html|head|\?xml|script|svg)/i.test(text)) return 'html';
  const plain = head.subarray(0, SNIFFED_BYTES);
  return plain.every((byte) => (byte >= 9 && byte <= 13) || (byte >= 32 && byte !== 127))
    ? 'text'
    : 'unknown';
}

const WAV_TYPES = ['audio/wav', 'audio/wave', 'audio/x-wav', 'audio/vnd.wave'];
const MEDIA_TYPES: Record<Container, readonly string[]> = {
  wav: WAV_TYPES,
  rf64: WAV_TYPES,
  bw64: WAV_TYPES,
  flac: ['audio/flac', 'audio/x-flac'],
  ogg: ['audio/ogg', 'audio/opus', 'audio/vorbis', 'application/ogg', 'audio/flac', 'audio/x-flac'],
  mp3: ['audio/mpeg', 'audio/mp3'],
};
/** Types that name what is in the Ogg, not the Ogg. */
const OGG_CODECS: Record<string, Encoding> = {
  'audio/opus': 'opus',
  'audio/vorbis': 'vorbis',
  'audio/flac': 'flac',
  'audio/x-flac': 'flac',
};

/**
 * Media types under which a container may be sent (RFC 2361 and custom for WAV, RFC 9639 for FLAC, RFC 5334 and 7845
 * for Ogg, RFC 3003 for MP3).
 */
export const mediaTypesOf = (container: Container): readonly string[] => MEDIA_TYPES[container];

export const isContainer = (sniffed: Sniffed): sniffed is Container => Object.hasOwn(MEDIA_TYPES, sniffed);

/**
 * Whether content is what a media type says, parameters and letter case aside.
 *
 * @param encoding what was found in the container; null where nothing was
 */
export function matchesMediaType(mediaType: string, sniffed: Sniffed, encoding: Encoding | null): boolean {
  const bare = (mediaType.split(';')[0] ?? '').trim().toLowerCase();
  if (!isContainer(sniffed) || !mediaTypesOf(sniffed).includes(bare)) return false;
  const codec = sniffed === 'ogg' ? OGG_CODECS[bare] : undefined;
  return codec === undefined || encoding === null || codec === encoding;
}

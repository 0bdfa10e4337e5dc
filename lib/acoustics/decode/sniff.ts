import type { Container } from '../types';
import type { Sniffed } from './types';

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

/** What a file is by its first bytes (64 are enough), whatever its name or media type says. */
export function sniffContainer(head: Uint8Array): Sniffed {
  if (head.length === 0) return 'nothing';
  const four = ascii(head, 0, 4);
  const form = ascii(head, 8, 4);
  if (four === 'RIFF' || four === 'RIFX') return form === 'WAVE' || head.length < 12 ? 'wav' : 'riff-other';
  if (four === 'RF64') return 'rf64';
  if (four === 'BW64') return 'bw64';
  if (four === 'fLaC') return 'flac';
  if (four === 'OggS') return 'ogg';
  if (four.startsWith('ID3')) return 'mp3';
  if (
    head.length >= 4 &&
    head[0] === 0xff &&
    ((head[1] ?? 0) & 0xe0) === 0xe0 &&
    ((head[1] ?? 0) & 0x18) !== 0x08 &&
    ((head[1] ?? 0) & 0x06) !== 0 &&
    ((head[2] ?? 0) & 0xf0) !== 0xf0 &&
    ((head[2] ?? 0) & 0x0c) !== 0x0c
  )
    return 'mp3';
  if (four === 'FORM') return 'aiff';
  if (ascii(head, 4, 4) === 'ftyp') return 'mp4';
  if (four === '\u0089PNG' || four.startsWith('\u00ff\u00d8') || four === 'GIF8') return 'image';
  if (four.startsWith('PK') || four.startsWith('\u001f\u008b')) return 'archive';
  const text = ascii(head, 0, 64);
  if (/^\s*<(!doctype|html|\?xml|script|svg)/i.test(text)) return 'html';
  return head.every((byte) => byte === 9 || byte === 10 || byte === 13 || (byte >= 32 && byte !== 127))
    ? 'text'
    : 'unknown';
}

const MEDIA_TYPES: Record<Container, readonly string[]> = {
  wav: ['audio/wav', 'audio/wave', 'audio/x-wav', 'audio/vnd.wave'],
  rf64: ['audio/wav', 'audio/wave', 'audio/x-wav', 'audio/vnd.wave'],
  bw64: ['audio/wav', 'audio/wave', 'audio/x-wav', 'audio/vnd.wave'],
  flac: ['audio/flac', 'audio/x-flac'],
  ogg: ['audio/ogg', 'audio/opus', 'audio/vorbis', 'application/ogg', 'audio/flac'],
  mp3: ['audio/mpeg', 'audio/mp3'],
};

/** Media types under which a container may be sent. */
export const mediaTypesOf = (container: Container): readonly string[] => MEDIA_TYPES[container];

export const isContainer = (sniffed: Sniffed): sniffed is Container => Object.hasOwn(MEDIA_TYPES, sniffed);

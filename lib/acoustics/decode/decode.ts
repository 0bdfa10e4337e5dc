import type { AudioBlock, AudioFormat } from '../types';
import { createFlacReader } from './flac';
import { createMp3Reader } from './mp3';
import { OggReader } from './ogg';
import { id3Length, isContainer, mediaTypesOf, sniffContainer } from './sniff';
import type { AudioDecoder, DecodeResult, DecoderOptions, Reader, Sniffed } from './types';
import { WavReader } from './wav';

export { mediaTypesOf, sniffContainer } from './sniff';
export type { AudioDecoder, DecodeResult } from './types';

/** Bytes by which a file is known. */
const SNIFFED_BYTES = 64;
/** An ID3 tag before FLAC is looked through no further than this. */
const LONGEST_TAG_BYTES = 1 << 20;

/**
 * A streaming decoder for WAV (PCM 8 to 32 bit, float, A-law, mu-law, extensible), RF64 and BW64, FLAC, Ogg (Opus,
 * Vorbis, FLAC) and MP3. What the file is comes from its bytes, never from its name or media type.
 */
export function createDecoder(options: DecoderOptions): AudioDecoder {
  let head = new Uint8Array(0);
  let reader: Reader | null = null;
  let sniffed: Sniffed = 'nothing';
  let format: AudioFormat | null = null;
  const watched: DecoderOptions = {
    ...options,
    onFormat(found) {
      format = found;
      options.onFormat(found);
    },
  };

  const begin = async (atEnd: boolean): Promise<void> => {
    sniffed = sniffContainer(head.subarray(0, SNIFFED_BYTES));
    const tag = id3Length(head);
    if (tag > 0 && tag < LONGEST_TAG_BYTES) {
      if (head.length < tag + 4 && !atEnd) return;
      const behind = sniffContainer(head.subarray(tag, tag + SNIFFED_BYTES));
      if (behind === 'flac') {
        sniffed = 'flac';
        head = head.slice(tag);
      }
    }
    reader = readerFor(sniffed, watched);
    const first = head;
    head = new Uint8Array(0);
    await reader?.push(first);
  };

  let given = false;
  let begun = false;
  return {
    push(bytes) {
      if (bytes.length === 0) return;
      given = true;
      if (reader) return reader.push(bytes);
      if (begun) return;
      const joined = new Uint8Array(head.length + bytes.length);
      joined.set(head);
      joined.set(bytes, head.length);
      head = joined;
      if (head.length < SNIFFED_BYTES) return;
      return begin(false).then(() => {
        begun = reader !== null || head.length === 0;
      });
    },
    async end() {
      if (!begun && given) await begin(true);
      const result = (await reader?.end()) ?? {
        failure: 'unreadable' as const,
        reason: given ? `content-is-${sniffed}` : 'no-bytes',
        format: null,
        frames: 0,
        missingFrames: 0,
      };
      const answer: DecodeResult = {
        ok: result.failure === null,
        failure: result.failure,
        reason: result.reason,
        format: result.format ?? format,
        frames: result.frames,
        declaredFrames: (result.format ?? format)?.declaredFrames ?? null,
        missingFrames: result.missingFrames,
        sniffed,
        typeMatches:
          options.declaredMediaType === undefined ||
          (isContainer(sniffed) && mediaTypesOf(sniffed).includes(options.declaredMediaType)),
      };
      return answer;
    },
  };
}

function readerFor(sniffed: Sniffed, options: DecoderOptions): Reader | null {
  switch (sniffed) {
    case 'wav':
    case 'rf64':
    case 'bw64':
      return new WavReader(options);
    case 'flac':
      return createFlacReader(options);
    case 'ogg':
      return new OggReader(options);
    case 'mp3':
      return createMp3Reader(options);
    default:
      return null;
  }
}

/** Decode a whole file that is in memory. Channels are empty where it cannot be read. */
export async function decodeWhole(
  bytes: Uint8Array,
  declaredMediaType?: string,
): Promise<DecodeResult & { channels: Float32Array[] }> {
  const pieces: Float32Array[][] = [];
  const onBlock = (block: AudioBlock) => {
    block.forEach((channel, c) => {
      pieces[c] ??= [];
      pieces[c].push(channel.slice());
    });
  };
  const decoder = createDecoder({
    onFormat: () => undefined,
    onBlock,
    ...(declaredMediaType === undefined ? {} : { declaredMediaType }),
  });
  await decoder.push(bytes);
  const result = await decoder.end();
  return {
    ...result,
    channels: pieces.map((parts) => {
      const joined = new Float32Array(parts.reduce((sum, part) => sum + part.length, 0));
      let at = 0;
      for (const part of parts) {
        joined.set(part, at);
        at += part.length;
      }
      return joined;
    }),
  };
}

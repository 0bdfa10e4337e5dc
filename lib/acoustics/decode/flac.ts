import { FLACDecoder } from '@wasm-audio-decoders/flac';
import { type PackedFacts, PackedReader } from './packed';
import { id3Length } from './sniff';
import { checkFormat, type DecoderOptions, Unreadable } from './types';

/** Marker, block header and STREAMINFO (RFC 9639, 8.1 and 8.2), behind an ID3 tag of a usual size. */
const HEAD_BYTES = 42;

/** @throws Unreadable */
export function readStreamInfo(head: Uint8Array): PackedFacts {
  const at = id3Length(head);
  const block = head.subarray(at + 4);
  if (head.length < at + HEAD_BYTES || String.fromCharCode(...head.subarray(at, at + 4)) !== 'fLaC')
    throw new Unreadable('flac-marker-missing');
  if (((block[0] ?? 0) & 0x7f) !== 0) throw new Unreadable('streaminfo-missing');
  const info = block.subarray(4);
  const byte = (i: number) => info[i] ?? 0;
  const sampleRateHz = (byte(10) << 12) | (byte(11) << 4) | (byte(12) >> 4);
  const channels = ((byte(12) >> 1) & 0x07) + 1;
  const bitDepth = (((byte(12) & 0x01) << 4) | (byte(13) >> 4)) + 1;
  const total =
    (byte(13) & 0x0f) * 2 ** 32 + ((byte(14) << 24) >>> 0) + (byte(15) << 16) + (byte(16) << 8) + byte(17);
  checkFormat(sampleRateHz, channels);
  if (bitDepth < 4) throw new Unreadable('bit-depth-unknown');
  return {
    container: 'flac',
    encoding: 'flac',
    lossy: false,
    bitDepth,
    sampleRateHz,
    channels,
    declaredFrames: total === 0 ? null : total,
  };
}

export const createFlacReader = (options: DecoderOptions): PackedReader =>
  new PackedReader(options, () => new FLACDecoder(), HEAD_BYTES, readStreamInfo);

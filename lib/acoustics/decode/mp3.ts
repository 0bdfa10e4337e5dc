import { MPEGDecoder } from 'mpg123-decoder';
import { PackedReader } from './packed';
import type { DecoderOptions } from './types';

/** MPEG audio layer III. Its header declares no length worth believing. */
export const createMp3Reader = (options: DecoderOptions): PackedReader =>
  new PackedReader(
    options,
    () => new MPEGDecoder(),
    0,
    () => ({
      container: 'mp3',
      encoding: 'mp3',
      lossy: true,
      bitDepth: null,
      sampleRateHz: null,
      channels: null,
      declaredFrames: null,
    }),
  );

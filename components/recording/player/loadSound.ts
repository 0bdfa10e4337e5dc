import { WavReader } from '@/lib/acoustics/decode/wav';
import type { AudioFormat } from '@/lib/acoustics/types';
import { factorFor, upsample } from './upsample';

/** A recording that came over and could not be made into sound; the message is for people. */
export class SoundError extends Error {}

/**
 * Fetches a recording and makes a buffer of it that any browser plays. WAV is read by our own reader, bit for bit as
 * the measures saw it; FLAC, Ogg and MP3 by the browser.
 *
 * @throws SoundError
 */
export async function loadSound(
  context: BaseAudioContext,
  href: string,
  signal: AbortSignal,
): Promise<AudioBuffer> {
  const answer = await fetch(href, { signal });
  if (!answer.ok)
    throw new SoundError(
      `The sound could not be fetched (${answer.status}). Nothing was changed. Try again.`,
    );
  const bytes = new Uint8Array(await answer.arrayBuffer());
  const magic = String.fromCharCode(...bytes.subarray(0, 4));
  if (magic === 'RIFF' || magic === 'RF64' || magic === 'BW64') return bufferOfWav(context, bytes);
  try {
    return await context.decodeAudioData(bytes.buffer);
  } catch {
    throw new SoundError(
      'This browser cannot play this kind of file. The recording itself is kept as it came.',
    );
  }
}

function bufferOfWav(context: BaseAudioContext, bytes: Uint8Array): AudioBuffer {
  const blocks: Float32Array[][] = [];
  let format: AudioFormat | undefined;
  const reader = new WavReader({
    onFormat: (found) => {
      format = found;
    },
    onBlock: (block) => blocks.push(block.map((channel) => channel.slice())),
  });
  reader.push(bytes);
  reader.end();
  const frames = blocks.reduce((sum, block) => sum + (block[0]?.length ?? 0), 0);
  if (!format || frames === 0) throw new SoundError('There is no sound in this file. It is kept as it came.');
  const factor = factorFor(format.sampleRateHz);
  const buffer = context.createBuffer(
    Math.min(2, format.channels),
    frames * factor,
    format.sampleRateHz * factor,
  );
  for (let channel = 0; channel < buffer.numberOfChannels; channel++) {
    const samples = new Float32Array(frames);
    let at = 0;
    for (const block of blocks) {
      const part = block[channel];
      if (!part) continue;
      samples.set(part, at);
      at += part.length;
    }
    buffer.copyToChannel(factor === 1 ? samples : upsample(samples, factor), channel);
  }
  return buffer;
}

export interface WavFormat {
  sampleRateHz: number;
  bitDepth: 8 | 16 | 24 | 32 | 'float32';
}

const PCM = 1;
const IEEE_FLOAT = 3;

/** fmt and, for anything but PCM, fact: what RIFF asks for (Microsoft, "New Multimedia Data Types", from memory). */
function header(format: WavFormat, channels: number, frames: number, dataBytes: number): Uint8Array {
  const float = format.bitDepth === 'float32';
  const bits = format.bitDepth === 'float32' ? 32 : format.bitDepth;
  const align = (bits / 8) * channels;
  const length = float ? 58 : 44;
  const bytes = new Uint8Array(length);
  const view = new DataView(bytes.buffer);
  const ascii = (at: number, text: string) => bytes.set(new TextEncoder().encode(text), at);
  ascii(0, 'RIFF');
  view.setUint32(4, length - 8 + dataBytes + (dataBytes % 2), true);
  ascii(8, 'WAVEfmt ');
  view.setUint32(16, float ? 18 : 16, true);
  view.setUint16(20, float ? IEEE_FLOAT : PCM, true);
  view.setUint16(22, channels, true);
  view.setUint32(24, format.sampleRateHz, true);
  view.setUint32(28, format.sampleRateHz * align, true);
  view.setUint16(32, align, true);
  view.setUint16(34, bits, true);
  if (float) {
    ascii(38, 'fact');
    view.setUint32(42, 4, true);
    view.setUint32(46, frames, true);
  }
  ascii(length - 8, 'data');
  view.setUint32(length - 4, dataBytes, true);
  return bytes;
}

/** How one sample is written; PCM is rounded and cut at its rails, float is left as it is. */
function writerOf(view: DataView, depth: WavFormat['bitDepth']): (at: number, sample: number) => void {
  if (depth === 'float32') return (at, sample) => view.setFloat32(at, sample, true);
  const top = 2 ** (depth - 1);
  const code = (sample: number) => Math.max(-top, Math.min(top - 1, Math.round(sample * top)));
  if (depth === 8) return (at, sample) => view.setUint8(at, code(sample) + 128);
  if (depth === 16) return (at, sample) => view.setInt16(at, code(sample), true);
  if (depth === 32) return (at, sample) => view.setInt32(at, code(sample), true);
  return (at, sample) => {
    const value = code(sample);
    view.setUint16(at, value & 0xffff, true);
    view.setInt8(at + 2, value >> 16);
  };
}

/**
 * A WAV file (RIFF) of one or more channels: PCM with a plain 44-byte header, or 32-bit float with a fact chunk.
 * An odd number of data bytes is followed by the pad byte that RIFF asks for.
 *
 * @param channels in units of full scale, all of equal length; PCM is cut beyond full scale
 */
export function encodeWav(channels: readonly Float32Array[], format: WavFormat): Uint8Array {
  const frames = channels[0]?.length ?? 0;
  const bytesPerSample = format.bitDepth === 'float32' ? 4 : format.bitDepth / 8;
  const align = bytesPerSample * channels.length;
  const head = header(format, channels.length, frames, frames * align);
  const bytes = new Uint8Array(head.length + frames * align + ((frames * align) % 2));
  bytes.set(head);
  const write = writerOf(new DataView(bytes.buffer), format.bitDepth);
  channels.forEach((samples, c) => {
    for (let i = 0; i < frames; i++) write(head.length + i * align + c * bytesPerSample, samples[i] ?? 0);
  });
  return bytes;
}

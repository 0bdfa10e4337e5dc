/**
 * A WAV file (RIFF, PCM) of one or more channels, with a plain 44-byte header.
 *
 * @param channels in units of full scale; beyond it they are cut
 */
export function encodeWav(
  channels: readonly Float32Array[],
  format: { sampleRateHz: number; bitDepth: 8 | 16 | 24 | 32 },
): Uint8Array {
  const bytesPerSample = format.bitDepth / 8;
  const frames = channels[0]?.length ?? 0;
  const align = bytesPerSample * channels.length;
  const bytes = new Uint8Array(44 + frames * align);
  const view = new DataView(bytes.buffer);
  const ascii = (at: number, text: string) => bytes.set(new TextEncoder().encode(text), at);
  ascii(0, 'RIFF');
  view.setUint32(4, bytes.length - 8, true);
  ascii(8, 'WAVEfmt ');
  view.setUint32(16, 16, true);
  view.setUint16(20, 1, true);
  view.setUint16(22, channels.length, true);
  view.setUint32(24, format.sampleRateHz, true);
  view.setUint32(28, format.sampleRateHz * align, true);
  view.setUint16(32, align, true);
  view.setUint16(34, format.bitDepth, true);
  ascii(36, 'data');
  view.setUint32(40, frames * align, true);
  const top = 2 ** (format.bitDepth - 1);
  for (let i = 0; i < frames; i++) {
    for (let c = 0; c < channels.length; c++) {
      const at = 44 + i * align + c * bytesPerSample;
      const code = Math.max(-top, Math.min(top - 1, Math.round((channels[c]?.[i] ?? 0) * top)));
      if (format.bitDepth === 8) view.setUint8(at, code + 128);
      else if (format.bitDepth === 16) view.setInt16(at, code, true);
      else if (format.bitDepth === 32) view.setInt32(at, code, true);
      else {
        view.setUint16(at, code & 0xffff, true);
        view.setInt8(at + 2, code >> 16);
      }
    }
  }
  return bytes;
}

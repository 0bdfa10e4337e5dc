/**
 * Cuts a stream into frames of one length, wherever its pushes begin and end: whole frames are handed over together, a
 * frame that lies over two pushes in two parts.
 */
export class Framer {
  /** Samples of the frame that is begun. */
  filled = 0;

  constructor(readonly length: number) {}

  /**
   * @param onPart a part of a frame; `ends` when it is the frame's last
   * @param onWhole `count` whole frames from `at` on
   */
  push(
    samples: Float32Array,
    onPart: (part: Float32Array, ends: boolean) => void,
    onWhole: (frames: Float32Array, count: number) => void,
  ): void {
    let at = 0;
    if (this.filled > 0) {
      at = Math.min(samples.length, this.length - this.filled);
      this.filled += at;
      const ends = this.filled === this.length;
      if (ends) this.filled = 0;
      if (at > 0) onPart(samples.subarray(0, at), ends);
    }
    const count = Math.floor((samples.length - at) / this.length);
    if (count > 0) onWhole(samples.subarray(at, at + count * this.length), count);
    at += count * this.length;
    if (at === samples.length) return;
    this.filled = samples.length - at;
    onPart(samples.subarray(at), false);
  }
}

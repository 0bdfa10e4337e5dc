/**
 * Follows the positions that Ogg pages carry: where the sound begins, what its end cuts off, and what is lost between.
 * Units are samples a channel.
 */
export class Granules {
  /** Samples that came out of the codec. */
  #decoded = 0;
  /** Position of the stream before its first sample, and all that was lost since. */
  #offset: number | null = null;
  missing = 0;
  ended = false;

  /**
   * @param skip samples at the beginning that are not sound (pre-skip of Opus)
   * @param trimsStart whether a first page of more samples than its position says begins late (Vorbis I, A.2)
   */
  constructor(
    private readonly skip: number,
    private readonly trimsStart: boolean,
  ) {}

  /**
   * A page gave these samples.
   *
   * @returns which of them are sound, from and to
   */
  page(samples: number, granule: number | null, last: boolean): { from: number; to: number } {
    const before = this.#decoded;
    this.#decoded += samples;
    let from = Math.max(0, this.skip - before);
    let to = samples;
    if (granule !== null) {
      if (this.#offset === null) {
        const offset = granule - samples;
        if (offset < 0 && !last && this.trimsStart) from = Math.max(from, -offset);
        this.#offset = offset > 0 || (offset < 0 && !last && this.trimsStart) ? offset : 0;
      }
      const beyond = this.#offset + this.#decoded - granule;
      if (last && beyond > 0) to = Math.max(0, samples - beyond);
      else if (beyond < 0) this.#lose(-beyond);
    }
    if (last) this.ended = true;
    return { from: Math.min(from, to), to };
  }

  /** The file ends within a page that would have ended at this position. */
  cut(granule: number | null): void {
    if (granule === null || this.#offset === null) return;
    const lost = granule - this.#offset - this.#decoded;
    if (lost > 0) this.#lose(lost);
  }

  #lose(samples: number): void {
    this.missing += samples;
    this.#offset = (this.#offset ?? 0) + samples;
  }
}

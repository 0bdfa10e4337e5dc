import { Framer } from '../dsp/framer';
import { FloatList } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';

/** RMS a block of a filtered stream, in units of full scale. */
export class Envelope {
  readonly values = new FloatList();
  readonly #framer: Framer;
  readonly #sums: Float32Array;
  #begun = 0;

  /** @param block samples a value; @param mostSamples that a push will bring */
  constructor(
    private readonly kernels: Kernels,
    private readonly block: number,
    mostSamples: number,
  ) {
    this.#framer = new Framer(block);
    this.#sums = kernels.arena.floats(Math.ceil(mostSamples / block) + 1);
  }

  /** @param samples in the kernels' arena */
  push(samples: Float32Array): void {
    const sums = this.#sums;
    this.#framer.push(
      samples,
      (part, ends) => {
        this.kernels.energies(part, 1, part.length, sums);
        this.#begun += sums[0] as number;
        if (!ends) return;
        this.values.push(Math.sqrt(this.#begun / this.block));
        this.#begun = 0;
      },
      (frames, count) => {
        this.kernels.energies(frames, count, this.block, sums);
        for (let i = 0; i < count; i++) this.values.push(Math.sqrt((sums[i] as number) / this.block));
      },
    );
  }
}

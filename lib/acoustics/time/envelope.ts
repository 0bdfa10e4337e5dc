import { FloatList } from '../dsp/percentile';

/** RMS a block of a filtered stream, in units of full scale. */
export class Envelope {
  readonly values = new FloatList();
  #sum = 0;
  #n = 0;

  /** @param block samples a value */
  constructor(private readonly block: number) {}

  push(samples: Float32Array, length: number): void {
    for (let at = 0; at < length; ) {
      const end = Math.min(length, at + this.block - this.#n);
      let sum = 0;
      for (let i = at; i < end; i++) sum += (samples[i] as number) * (samples[i] as number);
      this.#sum += sum;
      this.#n += end - at;
      at = end;
      if (this.#n === this.block) {
        this.values.push(Math.sqrt(this.#sum / this.#n));
        this.#sum = 0;
        this.#n = 0;
      }
    }
  }
}

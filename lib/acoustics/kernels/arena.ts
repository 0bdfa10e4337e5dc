/** Places in an arena begin on this many bytes. */
const ALIGNMENT = 16;
/** Kernels may read this much beyond an array. */
const SLACK_BYTES = 64;

/**
 * Room for all that one channel of one clip needs, handed out in one piece after another and taken back at once. One
 * fixed piece of memory: arrays stay where they are, and a thread that is kept warm allocates next to nothing a clip.
 */
export class Arena {
  #next: number;

  constructor(
    readonly buffer: ArrayBuffer,
    private readonly base: number,
  ) {
    this.#next = base;
  }

  #take(bytes: number): number {
    const at = Math.ceil(this.#next / ALIGNMENT) * ALIGNMENT;
    if (at + bytes + SLACK_BYTES > this.buffer.byteLength) throw new RangeError('the arena is full');
    this.#next = at + bytes + SLACK_BYTES;
    return at;
  }

  /** @returns zeros */
  floats(length: number): Float32Array {
    return this.room(length).fill(0);
  }

  /** @returns whatever was there before: for what is written before it is read */
  room(length: number): Float32Array {
    return new Float32Array(this.buffer, this.#take(length * 4), length);
  }

  doubles(length: number): Float64Array {
    return new Float64Array(this.buffer, this.#take(length * 8), length).fill(0);
  }

  ints(length: number): Int32Array {
    return new Int32Array(this.buffer, this.#take(length * 4), length);
  }

  bytes(length: number): Uint8Array {
    return new Uint8Array(this.buffer, this.#take(length), length);
  }

  /** Take everything back. Arrays handed out before must not be used any more. */
  reset(): void {
    this.#next = this.base;
  }
}
